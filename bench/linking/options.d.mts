import type { LinkingCase, SetName } from './cases.js';

export const HELP: string;
/** What is asked for. Throws on what is not understood. */
export function readOptions(words: readonly string[]): Record<string, string | boolean | undefined>;
/** The cases of the set, or every combination of the values given. */
export function chosenCases(
  values: Record<string, string | boolean | undefined>,
  harness: {
    readonly ALL_FLOWS: readonly string[];
    readonly SET_NAMES: readonly SetName[];
    readonly USUAL: Omit<LinkingCase, 'flow' | 'ratio' | 'seed'>;
    casesOf(set: SetName): LinkingCase[];
  },
): LinkingCase[];

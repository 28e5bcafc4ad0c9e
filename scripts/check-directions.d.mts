export interface FoundImport {
  readonly specifier: string;
  readonly typeOnly: boolean;
  readonly line: number;
}
export function importsOf(text: string, name?: string): FoundImport[];
export function directionFault(
  file: string,
  one: { readonly specifier: string; readonly typeOnly: boolean },
): string | null;
export function checkDirections(packagesFolder: string): string[];

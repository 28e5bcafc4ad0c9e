import type { GridResult } from '@wakeloom/tracker';
import type { RowKey } from '@wakeloom/tracker/store/sample-columns';

export const FRAMES: number;
export const PATHLINES: number;
export const FINAL: readonly (number | null)[];
export function goldenSample(p: number, k: number): ({ provisional: number } & Record<RowKey, number>) | null;
export function goldenGrid(): GridResult;

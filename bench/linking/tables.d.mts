/** Everything that was measured, as text; records as `run.mjs` writes them, with the name of their file. */
export function fullTable(full: unknown, heldOut: unknown): string;
/** One row a flow, one column a ratio. */
export function compactTable(full: unknown): string;

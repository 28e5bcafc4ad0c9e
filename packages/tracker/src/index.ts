export type { ByteSink, ByteSource, Hasher, HasherFactory, Scratch, ScratchFile } from './core/bytes.js';
export * from './core/columns.js';
export * from './core/context.js';
export * from './core/errors.js';
export type { Quantity } from './core/quantity.js';
export type * from './detections/dump.js';
export * from './eulerian/grid.js';
export type * from './run/settings.js';
export * from './store/run-record.js';

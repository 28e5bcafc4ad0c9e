/** Operations of fault.worker.ts. */
export type WebFaultOperations = {
  spin: { args: { milliseconds: number; breathes: boolean }; value: number };
  'double-all': { args: { numbers: Float64Array<ArrayBuffer> }; value: Float64Array<ArrayBuffer> };
  'crash-in-timer': { args: null; value: never };
  'exhaust-buffers': { args: null; value: number };
  'fail-coded': { args: null; value: never };
  'return-function': { args: null; value: () => number };
};

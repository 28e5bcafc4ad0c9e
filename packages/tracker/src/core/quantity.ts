/** A value with its unit and, where known, a standard uncertainty in the same unit (0: taken as exact, null: unknown). */
export interface Quantity {
  readonly value: number;
  readonly unit: string;
  readonly standardUncertainty: number | null;
}

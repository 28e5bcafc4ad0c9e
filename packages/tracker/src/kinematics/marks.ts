/** What is known of a row while it is fitted; bits. */
export const MARK = {
  offFit: 1,
  offNeighbours: 2,
  hasVelocity: 4,
  /** Its pathline also has a sample in the next frame. */
  inNextFrame: 8,
  /** Its pathline also has a sample in one of the two frames before. */
  inTwoFramesBefore: 16,
  /** Its fit could not be freed from samples that are off their fit. */
  restsOnOff: 32,
  /** Its residual is above the limit; whether it is off its fit is still to be decided. */
  suspect: 64,
} as const;

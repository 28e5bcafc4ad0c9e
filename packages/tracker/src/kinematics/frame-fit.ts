import type { LinkedBlock, SampleBlock } from '../core/columns.js';

/**
 * Turns linked detections in frame order into samples in frame order. Both generators yield null after some ms of
 * work, so that the caller can look at messages, and blocks of finished samples, which are given away.
 */
export interface FrameFit {
  /** Takes the next frames; the block is borrowed while the generator runs. */
  add(block: LinkedBlock): Generator<SampleBlock | null, void>;
  /** What is left when all frames were added. */
  finish(): Generator<SampleBlock | null, void>;
}

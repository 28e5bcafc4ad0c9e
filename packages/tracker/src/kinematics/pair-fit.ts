import type { LinkedBlock, SampleBlock } from '../core/columns.js';
import { fitPairs } from './fit-pairs.js';
import type { FitParameters } from './fit-parameters.js';
import type { FrameFit } from './frame-fit.js';
import { RollingFrames } from './rolling-frames.js';

/** Samples of image pairs as the frames come: a pair is worked on when the frame after it is there, or the end. */
export class PairFit implements FrameFit {
  private readonly parameters: FitParameters;
  private readonly held = new RollingFrames();
  /** Held frames that are done with: the one before the next, which tells a first frame from a second, or none. */
  private before = 0;

  constructor(parameters: FitParameters) {
    this.parameters = parameters;
  }

  *add(block: LinkedBlock): Generator<SampleBlock | null, void> {
    if (block.number.length === 0) return;
    this.held.append(block);
    yield* this.advance(this.held.frames - 1);
  }

  *finish(): Generator<SampleBlock | null, void> {
    yield* this.advance(this.held.frames);
  }

  private *advance(to: number): Generator<SampleBlock | null, void> {
    if (to <= this.before) return;
    const steps = fitPairs(this.held.view(this.held.frames), { from: this.before, to }, this.parameters);
    for (;;) {
      const step = steps.next();
      yield step.done ? step.value : null;
      if (step.done) break;
    }
    this.held.drop(to - 1);
    this.before = 1;
  }
}

import { fitParameters } from '@wakeloom/tracker/kinematics/fit-parameters';
import { fitWindow } from '@wakeloom/tracker/kinematics/fit-window';
import { madeBlock, madeSettings } from './made-block.mjs';

/** Made detections linked by their true particles, and the parameters a run would fit them with (span 7). */
export function madeLinked(options) {
  const { block, particle } = madeBlock(options);
  const linked = { ...block, pathline: particle, linkRisk: new Float32Array(particle.length) };
  const prior = {
    frameStep: 1,
    noise: [0.005, 0.005, options.dims === 3 ? 0.005 : 0],
    noiseMeasured: true,
    span: 7,
    reach: [0.4, 0.4, 0.4],
    spacing: 1,
    displacementRatio: 0.3,
    displacementRatio95: 0.5,
  };
  return { linked, parameters: fitParameters(madeSettings(), prior), prior };
}

/** Samples of made detections, as one block. */
export function madeSamples(options) {
  const { linked, parameters } = madeLinked(options);
  return fitWindow(linked, { from: 0, to: linked.number.length }, parameters);
}

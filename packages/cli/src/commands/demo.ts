import { WakeloomError } from '@wakeloom/tracker/core/errors';
import type { Verb } from '../verbs.js';

export const DEMO: Verb = {
  name: 'demo',
  about: 'writes a demo dump and its run sheet',
  usage: 'wakeloom demo',
  options: (parser) => parser,
  run: async () => {
    throw new WakeloomError('run/not-joined', 'demo: not joined yet');
  },
};

import type { Hooks } from '../hooks.js';
import { withInterrupt } from '../interrupt.js';
import { eventText } from '../messages.js';
import { createProgress } from '../progress.js';
import type { Terminal } from '../terminal.js';

/** Long work with progress, warnings as they come, and Ctrl-C. The progress line is gone when this settles. */
export async function longWork<T>(terminal: Terminal, quiet: boolean, work: (hooks: Hooks) => Promise<T>): Promise<T> {
  const progress = createProgress(terminal, { quiet });
  try {
    return await withInterrupt(progress.say, (signal) =>
      work({
        signal,
        onProgress: progress.update,
        onEvent(event) {
          const text = quiet ? null : eventText(event, terminal);
          if (text !== null) progress.say(text);
        },
      }),
    );
  } finally {
    progress.end();
  }
}

/** A word as it must be typed: quoted where shells would split or change it. */
export function typedWord(word: string): string {
  return /^[\w./\\:+@%=,-]+$/.test(word) ? word : `"${word}"`;
}

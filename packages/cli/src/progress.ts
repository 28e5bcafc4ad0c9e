import { formatCount, formatDuration, formatNumber } from '@wakeloom/tracker/figures/number-format';
import { plainText } from './plain-text.js';
import type { Terminal } from './terminal.js';

/** Shows long work. `say` prints a line without tearing the progress line. */
export interface Progress {
  update(stage: string, done: number, total: number | null, unit: string): void;
  say(line: string): void;
  end(): void;
}

/** Least time between two drawings of the line, ms. */
const REDRAW_MS = 100;
/** Times of the first plain lines after the start, s; then every 60 s. A short run stays silent. */
const PLAIN_AT = [10, 20, 40];
/** A stage keeps the line for so long after its last report, so that stages that work in turns do not flicker, ms. */
const STAY_MS = 400;

/**
 * Progress on stderr: on a terminal one line redrawn at most ten times a second, with rate and time left; elsewhere a
 * plain line after 10, 20, 40 s and then every minute; with `quiet` nothing. Only `\r` and blanks are used to redraw.
 * @param now monotonic milliseconds
 */
export function createProgress(
  terminal: Pick<Terminal, 'say' | 'draw' | 'redraws' | 'columns'>,
  options: { quiet: boolean; now?: () => number },
): Progress {
  const now = options.now ?? (() => performance.now());
  const started = now();
  const stages = new Map<string, { since: number; from: number }>();
  let shown = { stage: '', at: Number.NEGATIVE_INFINITY };
  let drawn = 0;
  let drawnAt = Number.NEGATIVE_INFINITY;
  let plainLines = 0;

  const clear = () => {
    if (drawn > 0) terminal.draw(`\r${' '.repeat(drawn)}\r`);
    drawn = 0;
  };
  const plainDue = () => {
    const due = PLAIN_AT[plainLines] ?? PLAIN_AT[PLAIN_AT.length - 1]! + 60 * (plainLines - PLAIN_AT.length + 1);
    return now() - started >= due * 1000;
  };
  return {
    update(stage, done, total, unit) {
      const time = now();
      let known = stages.get(stage);
      if (known === undefined) {
        known = { since: time, from: done };
        stages.set(stage, known);
      }
      if (options.quiet) return;
      if (stage !== shown.stage && time - shown.at < STAY_MS) return;
      shown = { stage, at: time };
      const seconds = (time - known.since) / 1000;
      const words = () => progressWords({ stage, done, total, unit, rate: (done - known.from) / seconds, seconds });
      if (terminal.redraws) {
        if (time - drawnAt < REDRAW_MS && done !== total) return;
        const room = Math.max(20, terminal.columns - 1);
        const line = withBar(words(), done, total, room);
        // Blanks over the rest of a longer line before it.
        terminal.draw(`\r${line.padEnd(drawn)}`);
        drawn = line.length;
        drawnAt = time;
      } else if (plainDue()) {
        terminal.say(words());
        plainLines++;
      }
    },
    say(line) {
      clear();
      terminal.say(line);
    },
    end: clear,
  };
}

/** `linking: 258 of 600 frames, 43 %, 1200 frames/s, 2.1 s left`. Rate and time left once a second has passed. */
export function progressWords(state: {
  stage: string;
  done: number;
  total: number | null;
  unit: string;
  rate: number;
  seconds: number;
}): string {
  const { stage, done, total, unit, rate, seconds } = state;
  const count = (value: number) => (unit === 'bytes' ? `${formatNumber(value / 1e6, 3)} MB` : formatCount(value));
  const word = unit === 'bytes' ? '' : ` ${unit}`;
  const parts =
    total === null
      ? [`${stage}: ${count(done)}${word}`]
      : [`${stage}: ${count(done)} of ${count(total)}${word}`, `${Math.floor((100 * done) / Math.max(1, total))} %`];
  if (seconds >= 1 && rate > 0 && Number.isFinite(rate)) {
    parts.push(
      unit === 'bytes'
        ? `${formatNumber(rate / 1e6, 3)} MB/s`
        : `${formatNumber(Number(rate.toPrecision(3)), 3)} ${unit}/s`,
    );
    if (total !== null && done < total) parts.push(`${formatDuration((total - done) / rate)} left`);
  }
  return plainText(parts.join(', '));
}

const BAR = 20;

function withBar(words: string, done: number, total: number | null, room: number): string {
  if (total === null || words.length + BAR + 3 > room) return words.slice(0, room);
  const full = Math.round((BAR * Math.min(done, total)) / Math.max(1, total));
  return `[${'#'.repeat(full)}${'.'.repeat(BAR - full)}] ${words}`;
}

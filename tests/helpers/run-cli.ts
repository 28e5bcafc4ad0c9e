import { spawn } from 'node:child_process';
import { fileURLToPath } from 'node:url';

const BIN = fileURLToPath(new URL('../../packages/cli/bin/wakeloom.mjs', import.meta.url));

/** How a command ended and what it said. */
export interface CliResult {
  readonly code: number | null;
  readonly stdout: string;
  readonly stderr: string;
}

/** What a test may do to a command: its folder, its environment, and a look at stderr as it comes. */
export interface CliOptions {
  readonly cwd?: string;
  readonly env?: Readonly<Record<string, string>>;
  /** Close our end of its standard output after the first data, as `head` does. */
  readonly stopReading?: boolean;
  readonly onStderr?: (text: string, kill: (signal: NodeJS.Signals) => void) => void;
}

/** Runs the built command (`npm run compile` first) without a terminal and without what a user's environment sets. */
export function runCli(words: readonly string[], options: CliOptions = {}): Promise<CliResult> {
  return new Promise((resolve, reject) => {
    const {
      npm_command: _c,
      npm_lifecycle_event: _e,
      NO_COLOR: _n,
      FORCE_COLOR: _f,
      WAKELOOM_DEBUG: _d,
      NODE_OPTIONS: _o,
      ...clean
    } = process.env;
    const child = spawn(process.execPath, [BIN, ...words], {
      cwd: options.cwd,
      env: { ...clean, ...options.env },
      stdio: ['ignore', 'pipe', 'pipe'],
    });
    let stdout = '';
    let stderr = '';
    child.stdout.setEncoding('utf8').on('data', (text: string) => {
      stdout += text;
      if (options.stopReading) child.stdout.destroy();
    });
    child.stderr.setEncoding('utf8').on('data', (text: string) => {
      stderr += text;
      options.onStderr?.(stderr, (signal) => child.kill(signal));
    });
    child.on('error', reject);
    child.on('close', (code) => resolve({ code, stdout, stderr }));
  });
}

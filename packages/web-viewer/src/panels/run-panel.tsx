import { formatCount } from '@wakeloom/tracker/figures/number-format';
import type { AppState, Progress } from '../state/app-state.js';

/** Start and stop, and where the run is. */
export function RunPanel({ state }: { state: AppState }) {
  const phase = state.phase.value;
  const busy = state.busy.value;
  return (
    <div class="run">
      <div class="buttons">
        <button type="submit" class="first" disabled={busy || state.files.value.length === 0}>
          Process
        </button>
        <button type="button" disabled={phase !== 'working'} onClick={state.abort}>
          Stop
        </button>
      </div>
      {busy && <Bar progress={state.progress.value} />}
      <p role="status" class="status">
        {statusOf(state)}
      </p>
      {state.failure.value !== null && (
        <p role="alert" class="failure">
          {state.failure.value}
        </p>
      )}
    </div>
  );
}

function Bar({ progress }: { progress: Progress | null }) {
  const share =
    progress === null || progress.total === null || progress.total === 0 ? null : progress.done / progress.total;
  return (
    <>
      {/* Without a value the bar shows that work goes on, not how far it is. */}
      <progress aria-label="Progress of the run" max={1} value={share ?? undefined} />
      <p class="hint">{progress === null ? 'starting' : words(progress)}</p>
    </>
  );
}

function words({ stage, done, total, unit }: Progress): string {
  const all = total === null ? '' : ` of ${formatCount(total)}`;
  return `${stage}: ${formatCount(done)}${all} ${unit}`;
}

/** Said once a change, so that a screen reader is not flooded with counts. */
function statusOf(state: AppState): string {
  switch (state.phase.value) {
    case 'ready':
      return state.files.value.length === 0 ? 'Waiting for a dump.' : 'Ready to process.';
    case 'working':
      return 'Processing.';
    case 'stopping':
      return 'Stopping.';
    case 'stopped':
      return 'Stopped. Nothing was kept.';
    case 'failed':
      return 'The run failed.';
    case 'done':
      return 'Done.';
  }
}

import { formatBytes } from '@wakeloom/tracker/figures/number-format';
import type { AppState, ShownResult } from '../state/app-state.js';

/** The files of the result, to be saved one by one or together; they are gone with the page. */
export function FilesPanel({ state, result }: { state: AppState; result: ShownResult }) {
  return (
    <section aria-labelledby="files-title">
      <h2 id="files-title">Result files</h2>
      <p class="hint">They lie in the memory of this page and go with it; save what you want to keep in one folder.</p>
      <button type="button" class="all" disabled={state.busy.value} onClick={() => void state.saveAll(result)}>
        Save all as one archive
      </button>
      <ul class="files">
        {result.files.map(({ name, bytes }) => (
          <li key={name}>
            <span>
              {name} <span class="quiet">{formatBytes(bytes)}</span>
            </span>
            <button
              type="button"
              aria-label={`Save ${name}`}
              disabled={state.busy.value}
              onClick={() => void state.save(name)}
            >
              Save
            </button>
          </li>
        ))}
      </ul>
    </section>
  );
}

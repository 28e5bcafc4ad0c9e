import { useSignal } from '@preact/signals';
import { formatBytes } from '@wakeloom/tracker/figures/number-format';
import type { AppState } from '../state/app-state.js';

/** Where the dump comes in: dropped on the field, or chosen. */
export function DumpPanel({ state }: { state: AppState }) {
  const over = useSignal(false);
  const chosen = state.files.value;
  const sheet = state.sheet.value;
  return (
    <section aria-labelledby="dump-title">
      <h2 id="dump-title">Dump</h2>
      <label
        class={over.value ? 'drop over' : 'drop'}
        onDragOver={(event) => {
          event.preventDefault();
          over.value = true;
        }}
        onDragLeave={() => {
          over.value = false;
        }}
        onDrop={(event) => {
          event.preventDefault();
          over.value = false;
          state.chooseFiles(event.dataTransfer?.files ?? []);
        }}
      >
        <input
          type="file"
          multiple
          disabled={state.busy.value}
          onChange={(event) => {
            state.chooseFiles(event.currentTarget.files ?? []);
            // Else choosing the same file again, after it has changed, would go unnoticed.
            event.currentTarget.value = '';
          }}
        />
        <strong>Choose or drop the dump</strong>
        <span>
          Positions of one run: text (also gzip, zstd), NPY, HDF5 or Parquet; its run sheet (YAML) too if there is one
        </span>
      </label>
      {chosen.length > 0 && (
        <ul class="chosen" aria-label="Files of the dump">
          {chosen.map((file) => (
            <li key={file.name}>
              <span>{file.name}</span> <span class="quiet">{formatBytes(file.size)}</span>
            </li>
          ))}
        </ul>
      )}
      {sheet !== null && (
        <p class="sheet">
          <span>
            {sheet.name} <span class="quiet">run sheet; what is filled in below overrules it</span>
          </span>
          <button
            type="button"
            aria-label={`Leave out ${sheet.name}`}
            disabled={state.busy.value}
            onClick={state.dropSheet}
          >
            Leave out
          </button>
        </p>
      )}
    </section>
  );
}

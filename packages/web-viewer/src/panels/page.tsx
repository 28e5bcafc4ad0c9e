import type { AppState } from '../state/app-state.js';
import { DumpPanel } from './dump-panel.js';
import { FiguresPanel } from './figures-panel.js';
import { FilesPanel } from './files-panel.js';
import { PicturePanel } from './picture-panel.js';
import { RunPanel } from './run-panel.js';
import { SettingsPanel } from './settings-panel.js';

/** The whole page. */
export function Page({ state }: { state: AppState }) {
  const result = state.result.value;
  return (
    <>
      <header>
        <h1>Wakeloom</h1>
        <p>
          From a dump of particle positions to pathlines and a grid of the flow, inside this page. Nothing is sent
          anywhere.
        </p>
      </header>
      <main>
        <form
          aria-label="Run"
          onSubmit={(event) => {
            event.preventDefault();
            void state.process();
          }}
        >
          <DumpPanel state={state} />
          <SettingsPanel state={state} />
          <RunPanel state={state} />
        </form>
        <div class="result" aria-busy={state.busy.value}>
          {result === null ? (
            <div class="empty">
              <p>
                {state.busy.value
                  ? 'The pathlines appear here when the run is done.'
                  : 'The pathlines of the run will appear here.'}
              </p>
            </div>
          ) : (
            <>
              {result.preview !== null && (
                <PicturePanel
                  preview={result.preview}
                  lengthUnit={result.record.figures.lengthUnit}
                  velocityUnit={result.record.figures.velocityUnit}
                />
              )}
              <div class="details">
                <FiguresPanel record={result.record} />
                <FilesPanel state={state} result={result} />
              </div>
            </>
          )}
        </div>
      </main>
    </>
  );
}

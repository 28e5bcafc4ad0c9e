import type { AppState } from '../state/app-state.js';
import { SETTING_FIELDS, type SettingField } from '../state/setting-fields.js';

/** The settings a first look needs; all others keep the program's defaults. */
export function SettingsPanel({ state }: { state: AppState }) {
  return (
    <section aria-labelledby="settings-title">
      <h2 id="settings-title">Settings</h2>
      <div class="fields">
        {SETTING_FIELDS.map((field) => (
          <Field key={field.option} field={field} state={state} />
        ))}
        <div class="field">
          <label for="field-threads">Worker threads</label>
          <input
            id="field-threads"
            type="number"
            min={1}
            max={64}
            aria-describedby="hint-threads"
            disabled={state.busy.value}
            value={state.threads.value}
            onInput={(event) => {
              const count = Math.round(event.currentTarget.valueAsNumber);
              if (count >= 1) state.threads.value = Math.min(64, count);
            }}
          />
          <p id="hint-threads" class="hint">
            the result does not depend on it
          </p>
        </div>
      </div>
    </section>
  );
}

function Field({ field, state }: { field: SettingField; state: AppState }) {
  const id = `field-${field.option}`;
  const hint = `hint-${field.option}`;
  const value = state.options.value[field.option];
  const disabled = state.busy.value;
  const set = (text: string) => {
    state.options.value = { ...state.options.value, [field.option]: text };
  };
  return (
    <div class="field">
      <label for={id}>{field.label}</label>
      {field.choices === undefined ? (
        <input
          id={id}
          type="text"
          autocomplete="off"
          spellcheck={false}
          aria-describedby={hint}
          disabled={disabled}
          value={value}
          onInput={(event) => set(event.currentTarget.value)}
        />
      ) : (
        <select
          id={id}
          aria-describedby={hint}
          disabled={disabled}
          value={value}
          onChange={(event) => set(event.currentTarget.value)}
        >
          {field.choices.map((choice) => (
            <option key={choice.value} value={choice.value}>
              {choice.words}
            </option>
          ))}
        </select>
      )}
      <p id={hint} class="hint">
        {field.hint}
      </p>
    </div>
  );
}

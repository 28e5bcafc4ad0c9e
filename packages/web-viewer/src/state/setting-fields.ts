/** One field of the settings form: an option of the command line by its name, and its words. */
export interface SettingField {
  readonly option: 'rate' | 'scale' | 'bin' | 'y-axis';
  readonly label: string;
  readonly hint: string;
  /** Answers to choose from; absent: free text. */
  readonly choices?: readonly { readonly value: string; readonly words: string }[];
  /** Value at the start; empty leaves the setting to the program. */
  readonly start: string;
}

/** Fields in the order of the form. */
export const SETTING_FIELDS: readonly SettingField[] = [
  { option: 'rate', label: 'Frame rate', hint: 'such as 500 Hz, or empty: frames', start: '' },
  { option: 'scale', label: 'Scale', hint: 'such as 0.05 mm/px, or empty: px', start: '' },
  { option: 'bin', label: 'Bin of the grid', hint: 'such as 2 mm, or empty: automatic', start: '' },
  {
    option: 'y-axis',
    label: 'Dump’s y axis',
    hint: 'images: mostly down',
    choices: [
      { value: '', words: 'not said (up)' },
      { value: 'up', words: 'points up' },
      { value: 'down', words: 'points down' },
    ],
    start: '',
  },
];

/** Options that are filled in, trimmed; those left empty stay with the program's defaults. */
export function filledOptions(values: Readonly<Record<string, string>>): Record<string, string> {
  const trimmed = Object.entries(values).map(([option, value]) => [option, value.trim()] as const);
  return Object.fromEntries(trimmed.filter(([, value]) => value !== ''));
}

import { parseArgs } from 'node:util';

const text = { type: 'string' };
const flag = { type: 'boolean' };

/** Options that choose cases one by one: option, field of the case, and whether it is a number. */
const CHOICES = [
  ['flows', 'flow', false],
  ['ratios', 'ratio', true],
  ['noise', 'noise', true],
  ['losses', 'losses', true],
  ['ghosts', 'ghosts', true],
  ['particles', 'perFrame', true],
  ['frames', 'frames', true],
  ['side', 'side', true],
  ['seeds', 'seed', true],
  ['care', 'care', false],
];

/** Field of a case by the word that `--risk-by` takes. */
export const FIELDS = {
  flow: 'flow',
  ratio: 'ratio',
  noise: 'noise',
  losses: 'losses',
  ghosts: 'ghosts',
  particles: 'perFrame',
};

/** The words that `--help` prints. */
export const HELP = `Links dumps with known truth and scores the links, beside a linker that is told the true flow
(oracle) and plain nearest neighbour. Reads the sources of the library; no build needed.

  npm run bench:linking -- --flows street,random --ratios 1 --seeds 1

--set NAME       quick (8 dumps), table (every flow at every ratio), full (adds noise, losses, ghosts, densities and
                 image pairs), held-out (seeds set aside: look once, at the end)
--flows --ratios --seeds --noise --losses --ghosts --particles --frames --care
                 values with commas between them: every combination is run (all flows, ratios 0.3, 0.6 and 1, seed 1,
                 the rest as usual unless given); beside --set, only the cases of the set that have such a value.
                 --noise in px, --losses and --ghosts as shares, --particles a frame
--side SHARE     look at the middle of the view only: share of its sides (default 1)
--pairs          image pairs; --frames is twice their number (default 200)
--risk-by WORD   show the links by stated risk for each flow, ratio, noise, losses, ghosts or particles apart as well
--workers N      processes (default 2)
--out FILE       write the figures as JSON
--record         write them to bench/results and make the tables anew (needs --set full or held-out)
--tables         only make the tables anew from what stands in bench/results
--no-cache       make all truth anew and keep none
`;

/** What is asked for. Throws on what is not understood. */
export function readOptions(words) {
  const { values } = parseArgs({
    args: words,
    options: {
      ...Object.fromEntries(CHOICES.map(([name]) => [name, text])),
      set: text,
      workers: text,
      'risk-by': text,
      out: text,
      pairs: flag,
      record: flag,
      tables: flag,
      'no-cache': flag,
      help: flag,
    },
  });
  if (values.record) {
    const chosen = CHOICES.some(([name]) => values[name] !== undefined) || values.pairs;
    if (chosen || (values.set !== 'full' && values.set !== 'held-out')) {
      throw new Error('--record: expected --set full or --set held-out beside it, and no choice of cases');
    }
  }
  const part = values['risk-by'];
  if (part !== undefined && !Object.hasOwn(FIELDS, part)) {
    throw new Error(`--risk-by: got ${part}, expected ${Object.keys(FIELDS).join(', ')}`);
  }
  return values;
}

/** The cases of the set, or every combination of the values given. Throws on what is not understood. */
export function chosenCases(values, { ALL_FLOWS, casesOf, SET_NAMES, USUAL }) {
  const given = new Map();
  for (const [name, field, isNumber] of CHOICES) {
    if (values[name] === undefined) continue;
    given.set(
      field,
      values[name].split(',').map((word) => (isNumber ? numberOf(name, word) : word)),
    );
  }
  for (const flow of given.get('flow') ?? []) {
    if (!ALL_FLOWS.includes(flow)) throw new Error(`--flows: got ${flow}, expected ${ALL_FLOWS.join(', ')}`);
  }
  if (values.set !== undefined) {
    if (!SET_NAMES.includes(values.set)) throw new Error(`--set: got ${values.set}, expected ${SET_NAMES.join(', ')}`);
    const wanted = (one) => [...given].every(([field, list]) => list.includes(one[field]));
    return casesOf(values.set).filter((one) => wanted(one) && (!values.pairs || one.pairs));
  }
  const frames = values.pairs ? 200 : USUAL.frames;
  let cases = [{ ...USUAL, pairs: values.pairs ?? false, frames }];
  for (const [, field] of CHOICES) {
    const usual = { flow: ALL_FLOWS, ratio: [0.3, 0.6, 1], seed: [1] }[field] ?? [cases[0][field]];
    cases = cases.flatMap((one) => (given.get(field) ?? usual).map((value) => ({ ...one, [field]: value })));
  }
  return cases;
}

function numberOf(name, word) {
  const value = Number(word);
  if (word.trim() === '' || !Number.isFinite(value)) throw new Error(`--${name}: got ${word}, expected a number`);
  return value;
}

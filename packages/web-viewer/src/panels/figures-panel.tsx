import { formatCount, formatQuantity } from '@wakeloom/tracker/figures/number-format';
import type { RunRecord } from '@wakeloom/tracker/store/run-record';

/** What a person wants to know of a run first: counts, speeds, warnings, assumptions, digest. */
export function FiguresPanel({ record }: { record: RunRecord }) {
  const { counts, figures } = record;
  const setAside = counts.rowsSetAside.reduce((sum, one) => sum + one.count, 0);
  const rows: readonly (readonly [string, string])[] = [
    ['Detections read', formatCount(counts.rowsRead)],
    ['Rows set aside', formatCount(setAside)],
    ['Frames', formatCount(counts.framesPresent)],
    ['Pathlines', formatCount(counts.pathlines)],
    ['Samples', formatCount(counts.samples)],
    ['Detections not linked', formatCount(counts.unlinkedDetections)],
    ['In short fragments', formatCount(counts.shortFragmentDetections)],
    ['Bins filled', `${formatCount(counts.binsFilled)} of ${formatCount(counts.bins)}`],
    ['Mean speed', formatQuantity(figures.meanSpeed, figures.velocityUnit)],
    ['Peak speed', formatQuantity(figures.peakSpeed, figures.velocityUnit)],
  ];
  return (
    <section aria-labelledby="figures-title">
      <h2 id="figures-title">Figures of the run</h2>
      <dl class="figures">
        {rows.map(([name, value]) => (
          <div key={name}>
            <dt>{name}</dt>
            <dd>{value}</dd>
          </div>
        ))}
      </dl>
      <Sentences title="Warnings" sentences={record.warnings} />
      <Sentences title="Assumed" sentences={record.assumptions} />
      <h3>Content digest</h3>
      <p>
        <code id="digest">{record.digest.content}</code>
      </p>
    </section>
  );
}

function Sentences({ title, sentences }: { title: string; sentences: readonly string[] }) {
  if (sentences.length === 0) return null;
  return (
    <>
      <h3>{title}</h3>
      <ul>
        {sentences.map((sentence) => (
          <li key={sentence}>{sentence}</li>
        ))}
      </ul>
    </>
  );
}

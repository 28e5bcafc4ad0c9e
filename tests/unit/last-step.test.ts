import { ActivePathlines } from '@wakeloom/tracker/linking/active-pathlines';
import { beginPathline } from '@wakeloom/tracker/linking/grow-pathline';
import { LastStep } from '@wakeloom/tracker/linking/last-step';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';

type Place = [number, number, number];

/** One pathline with one detection. */
function pathline(at: Place, time: number): ActivePathlines {
  const active = new ActivePathlines();
  active.reserve(1);
  beginPathline(active, 0, ...at, time);
  active.age[0] = 5;
  return active;
}

function predict(active: ActivePathlines, [x, y, z]: Place): void {
  active.px[0] = x;
  active.py[0] = y;
  active.pz[0] = z;
}

function velocityOf(step: LastStep): Place {
  return [step.u, step.v, step.w];
}

function middleOf(step: LastStep): Place {
  return [step.mx, step.my, step.mz];
}

function expectNear(got: readonly number[], want: readonly number[], tolerance = 1e-13): void {
  for (const [axis, value] of want.entries()) expect(Math.abs(got[axis] - value)).toBeLessThan(tolerance);
}

/** On a helix about the z axis: a circle in plane, even along z. */
const helix = (time: number): Place => [2 * Math.cos(0.7 * time), 2 * Math.sin(0.7 * time), 0.3 * time];

const chordOf = (from: number, to: number): Place => {
  const [a, b] = [helix(from), helix(to)];
  return [0, 1, 2].map((axis) => (b[axis] - a[axis]) / (to - from)) as Place;
};

const middle = (a: Place, b: Place): Place => [0, 1, 2].map((axis) => 0.5 * (a[axis] + b[axis])) as Place;

describe('last step of a pathline', () => {
  it('is the chord where no frame was missed, whatever was predicted', () => {
    const random = randomStream(61, 'chords');
    for (let trial = 0; trial < 20; trial++) {
      const place = (): Place => [random.normal(), random.normal(), random.normal()];
      const [from, to] = [place(), place()];
      const start = random.uniform();
      const step = 0.5 + random.uniform();
      const active = pathline(from, start);
      predict(active, place());
      const last = new LastStep();
      last.take(active, 0, ...to, start + step);
      expectNear(
        velocityOf(last),
        from.map((x, axis) => (to[axis] - x) / step),
        1e-12,
      );
      expectNear(middleOf(last), middle(from, to), 1e-12);
    }
  });

  // Uneven times, so that shares of the time would show.
  it.each([[[0, 1, 2]], [[0, 1, 2, 3]], [[0, 0.8, 2.1, 2.5]]])(
    'over missed frames at times %j is that of the last interval where the predictions were exact',
    (times) => {
      const active = pathline(helix(times[0]), times[0]);
      const last = times.length - 1;
      for (let k = 1; k < last; k++) {
        predict(active, helix(times[k]));
        active.miss(0, times[k]);
      }
      predict(active, helix(times[last]));
      const step = new LastStep();
      step.take(active, 0, ...helix(times[last]), times[last]);
      expectNear(velocityOf(step), chordOf(times[last - 1], times[last]));
      expectNear(middleOf(step), middle(helix(times[last - 1]), helix(times[last])));
      // The chord over all of the gap would have been another velocity.
      const whole = chordOf(times[0], times[last]);
      expect(Math.hypot(step.u - whole[0], step.v - whole[1])).toBeGreaterThan(0.3);
    },
  );

  it('spreads what the detection was off the prediction over all of the gap', () => {
    const active = pathline(helix(0), 0);
    for (const time of [1, 2]) {
      predict(active, helix(time));
      active.miss(0, time);
    }
    predict(active, helix(3));
    const [x, y, z] = helix(3);
    const step = new LastStep();
    step.take(active, 0, x + 0.06, y - 0.03, z + 0.09, 3);
    const exact = chordOf(2, 3);
    // Three intervals since it was last seen, one of them the last.
    expectNear(velocityOf(step), [exact[0] + 0.02, exact[1] - 0.01, exact[2] + 0.03]);
    expectNear(middleOf(step), [
      x + 0.06 - 0.5 * (exact[0] + 0.02),
      y - 0.03 - 0.5 * (exact[1] - 0.01),
      z + 0.09 - 0.5 * (exact[2] + 0.03),
    ]);
  });

  it('is the chord over the gap where it was carried on straight', () => {
    const active = pathline([1, 2, 3], 0);
    for (const time of [1, 2]) {
      predict(active, [1 + 0.5 * time, 2 - 0.25 * time, 3 + time]);
      active.miss(0, time);
    }
    predict(active, [2.5, 1.25, 6]);
    const step = new LastStep();
    step.take(active, 0, 4, 2, 3, 3);
    expectNear(velocityOf(step), [1, 0, 0]);
    expectNear(middleOf(step), [3.5, 2, 3]);
  });

  it('is the chord over frames that held no detection at all, where nothing was predicted', () => {
    const active = pathline([1, 2, 3], 0);
    active.missed[0] = 2;
    predict(active, [9, 9, 9]);
    const step = new LastStep();
    step.take(active, 0, 4, 2, 6, 3);
    expectNear(velocityOf(step), [1, 0, 1]);
    expectNear(middleOf(step), [2.5, 2, 4.5]);
  });

  it('keeps nothing of the pathline before', () => {
    const step = new LastStep();
    const bent = pathline(helix(0), 0);
    predict(bent, helix(1));
    bent.miss(0, 1);
    predict(bent, helix(2));
    step.take(bent, 0, ...helix(2), 2);
    step.take(pathline([0, 0, 0], 0), 0, 2, 4, 6, 2);
    expect(velocityOf(step)).toEqual([1, 2, 3]);
    expect(middleOf(step)).toEqual([1, 2, 3]);
  });
});

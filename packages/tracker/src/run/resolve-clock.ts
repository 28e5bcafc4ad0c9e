import { isWakeloomError } from '../core/errors.js';
import type { Quantity } from '../core/quantity.js';
import type { GivenSettings } from './given-settings.js';
import { quantityIn } from './parse-quantity.js';
import type { ClockSettings, FluidSettings } from './settings.js';
import { waterProperties } from './water.js';

function inUnit(given: GivenSettings, key: string, unit: string, dimension: 'frequency' | 'time'): Quantity | null {
  const written = given.quantity(key);
  if (written === null) return null;
  return given.attempt(key, written, () => quantityIn(written, unit, dimension));
}

function pairs(given: GivenSettings): ClockSettings {
  const delay = inUnit(given, 'clock.pairs.delay', 's', 'time');
  const rate = inUnit(given, 'clock.pairs.rate', 'Hz', 'frequency');
  if (given.has('clock.rate')) {
    given.problem('clock.rate', 'got a frame rate beside pairs, expected clock.pairs.rate (pairs a second)');
  }
  if (delay === null || rate === null) {
    const [missing, key] = delay === null ? ['delay', 'clock.pairs.rate'] : ['rate', 'clock.pairs.delay'];
    given.problem(key, `got pairs without their ${missing}, expected clock.pairs.delay and clock.pairs.rate`);
    return { kind: 'none' };
  }
  if (delay.value * rate.value >= 1) {
    given.problem(
      'clock.pairs.delay',
      `got ${delay.value} s, expected less than one over the pair rate, ${1 / rate.value} s`,
    );
  }
  return { kind: 'pairs', delay, rate };
}

function bursts(given: GivenSettings): ClockSettings {
  const rate = inUnit(given, 'clock.rate', 'Hz', 'frequency');
  const every = inUnit(given, 'clock.bursts.every', 's', 'time');
  const frames = given.value('clock.bursts.frames') as number | null;
  if (frames === null) {
    given.problem('clock.bursts.every', 'got a time between bursts alone, expected clock.bursts.frames beside it');
    return { kind: 'none' };
  }
  if (rate === null) {
    given.problem('clock.bursts.frames', 'got bursts without a frame rate, expected clock.rate beside it');
    return { kind: 'none' };
  }
  if (every !== null && every.value < frames / rate.value) {
    const length = frames / rate.value;
    given.problem('clock.bursts.every', `got ${every.value} s, expected at least the length of a burst, ${length} s`);
  }
  return { kind: 'bursts', rate, frames, every };
}

/**
 * The clock: pairs, bursts, a rate, or the time column where it is asked for or named without a rate. Two at once
 * are a problem.
 */
export function resolveClock(given: GivenSettings): ClockSettings {
  const isPairs = given.has('clock.pairs.delay') || given.has('clock.pairs.rate');
  const isBursts = given.has('clock.bursts.frames') || given.has('clock.bursts.every');
  const times = given.value('clock.times') === true;
  const column = given.value('dump.columns.time');
  const named = given.has('dump.columns.time') && column !== 'auto' && column !== null;
  if (isPairs && isBursts) given.problem('clock.pairs.delay', 'got pairs and bursts, expected one of them');
  if (times && (isPairs || isBursts || given.has('clock.rate'))) {
    given.problem('clock.times', 'got a time column beside a rate, expected one clock');
  }
  if (isPairs) return pairs(given);
  if (isBursts) return bursts(given);
  if (times) return { kind: 'times' };
  const rate = inUnit(given, 'clock.rate', 'Hz', 'frequency');
  if (rate !== null) return { kind: 'rate', rate };
  return named ? { kind: 'times' } : { kind: 'none' };
}

/** Water by its temperature, or another fluid by viscosity and density; null where nothing is said. */
export function resolveFluid(given: GivenSettings): FluidSettings | null {
  const water = given.quantity('fluid.water');
  const viscosity = given.quantity('fluid.viscosity');
  const density = given.quantity('fluid.density');
  if (water !== null) {
    for (const key of ['fluid.viscosity', 'fluid.density']) {
      if (given.has(key)) given.problem(key, 'got a value beside fluid.water, expected one or the other');
    }
    const temperature = quantityIn(water, 'degC', 'temperature');
    try {
      const { density: rho, kinematicViscosity } = waterProperties(temperature.value);
      return { kind: 'water', temperature, kinematicViscosity, density: rho };
    } catch (error) {
      if (!isWakeloomError(error)) throw error;
      given.problem('fluid.water', error.message.replace(/^[^:]*: /, ''));
      return null;
    }
  }
  if (viscosity === null && density === null) return null;
  if (viscosity === null || density === null) {
    const [present, missing] = viscosity === null ? ['density', 'viscosity'] : ['viscosity', 'density'];
    given.problem(`fluid.${present}`, `got a fluid without its ${missing}, expected fluid.${missing} beside it`);
    return null;
  }
  return {
    kind: 'other',
    temperature: null,
    kinematicViscosity: quantityIn(viscosity, 'm2/s', 'viscosity').value,
    density: quantityIn(density, 'kg/m3', 'density').value,
  };
}

/** Numbers, counts and units as people read them. Pure text, no locale: a point for decimals, thin spaces between thousands. */

const THIN_SPACE = '\u2009';

/** A value rounded to `digits` significant digits (whole numbers in full); a dash for NaN; powers of ten outside 1e-4 .. 1e7. */
export function formatNumber(value: number, digits = 4): string {
  if (Number.isNaN(value)) return '–';
  if (!Number.isFinite(value)) return value > 0 ? '∞' : '−∞';
  if (value === 0) return '0';
  const size = Math.abs(value);
  if (size >= 1e7 || size < 1e-4) {
    const [mantissa, exponent] = value.toExponential(digits - 1).split('e');
    return `${mantissa}e${Number(exponent)}`.replaceAll('-', '−');
  }
  if (Number.isInteger(value)) return group(value.toString());
  const rounded = Number(value.toPrecision(digits));
  const decimals = Math.max(0, digits - 1 - Math.floor(Math.log10(Math.abs(rounded)) + 1e-12));
  return group(rounded.toFixed(decimals));
}

/** A whole number with its thousands set apart. */
export function formatCount(value: number): string {
  return Number.isFinite(value) ? group(Math.round(value).toString()) : '–';
}

/** Value and unit with a space between: `29.8 mm/s`. */
export function formatQuantity(value: number, unit: string, digits = 4): string {
  const shown = formatUnit(unit);
  return shown === '' ? formatNumber(value, digits) : `${formatNumber(value, digits)} ${shown}`;
}

/** A share as percent with a sensible number of digits: `0.31 %`, `12 %`, `< 0.01 %`. */
export function formatShare(share: number): string {
  if (Number.isNaN(share)) return '–';
  const percent = 100 * share;
  if (percent !== 0 && Math.abs(percent) < 0.01) return '< 0.01 %';
  return `${formatNumber(percent, Math.abs(percent) >= 10 ? 3 : 2)} %`;
}

/**
 * Value with its standard uncertainty, the latter to two digits (GUM 7.2.6) and the value to the same place:
 * `29.83 ± 0.12`. Without an uncertainty the plain number.
 */
export function formatUncertain(value: number, standardUncertainty: number | null): string {
  if (standardUncertainty === null || !(standardUncertainty > 0) || !Number.isFinite(standardUncertainty))
    return formatNumber(value);
  const exponent = Math.floor(Math.log10(Number(standardUncertainty.toPrecision(2))) + 1e-12);
  const decimals = 1 - exponent;
  if (decimals > 12 || decimals < -12) return `${formatNumber(value)} ± ${formatNumber(standardUncertainty, 2)}`;
  const place = 10 ** -decimals;
  const show = (number: number) =>
    group(decimals > 0 ? number.toFixed(decimals) : (Math.round(number / place) * place).toFixed(0));
  return `${show(value)} ± ${show(standardUncertainty)}`;
}

/** Unit as printed: `mm2/s2` becomes `mm²/s²`, `degC` °C, `um` µm; the plain number 1 is no unit. */
export function formatUnit(unit: string): string {
  if (unit === '1') return '';
  return unit
    .replace(/\bdegC\b/g, '°C')
    .replace(/\bdeg\b/g, '°')
    .replace(/\bum(?=[\d/*\s]|$)/g, 'µm')
    .replace(/(?<=[A-Za-zµ])\^?2(?!\d)/g, '²')
    .replace(/(?<=[A-Za-zµ])\^?3(?!\d)/g, '³');
}

/** Name of an axis with its unit (quantity over unit, SI Brochure 5.4.1, from memory): `x / mm`, `speed / (mm/s)`, `samples`. */
export function axisLabel(name: string, unit: string): string {
  const shown = formatUnit(unit);
  if (shown === '') return name;
  return shown.includes('/') ? `${name} / (${shown})` : `${name} / ${shown}`;
}

/** Seconds as people say them: `0.8 s`, `42 s`, `3 min 05 s`, `2 h 10 min`. */
export function formatDuration(seconds: number): string {
  if (!Number.isFinite(seconds)) return '–';
  if (seconds < 10) return `${seconds.toFixed(1)} s`;
  const whole = Math.round(seconds);
  if (whole < 60) return `${whole} s`;
  const minutes = Math.floor(whole / 60);
  if (minutes < 60) return `${minutes} min ${String(whole % 60).padStart(2, '0')} s`;
  return `${Math.floor(minutes / 60)} h ${String(minutes % 60).padStart(2, '0')} min`;
}

/** Bytes in powers of 1000: `12.3 MB`. */
export function formatBytes(bytes: number): string {
  const units = ['B', 'kB', 'MB', 'GB', 'TB'];
  let size = bytes;
  let step = 0;
  while (size >= 1000 && step < units.length - 1) {
    size /= 1000;
    step++;
  }
  return `${step === 0 ? size : formatNumber(size, 3)} ${units[step]}`;
}

function group(text: string): string {
  const negative = text.startsWith('-');
  const [whole, decimals] = (negative ? text.slice(1) : text).split('.');
  // Four digits stay together: 1234, but 12 345 (common practice, no source).
  const grouped = whole!.length > 4 ? whole!.replace(/\B(?=(\d{3})+$)/g, THIN_SPACE) : whole!;
  const shown = decimals === undefined ? grouped : `${grouped}.${decimals}`;
  return negative && /[1-9]/.test(shown) ? `−${shown}` : shown;
}

const LIST = String.raw`\[(?:[-+\d.eE,\s]|\[[-+\d.eE,\s]*\])*\]`;
const SPREAD = String.raw`(?:[ \t]*(?:\+-|\u00b1)[ \t]*[\d.eE+-]+)?`;
const UNIT = String.raw`[ \t]*[A-Za-z\u00b5\u03bc][\w/^]*`;
const LIST_WITH_UNIT = new RegExp(
  String.raw`(?<=[:,{[-][ \t]+)(${LIST})(${SPREAD}${UNIT})(?=[ \t]*(?:[,}\]#\r\n]|$))`,
  'g',
);

/**
 * People write `[812, 640] px`, which YAML does not allow: a list cannot be followed by a word. This turns such a
 * list into a quoted text of the same length, so that lines and columns in messages stay right. Lists of lists,
 * `[[0, 0], [5, 0], [5, 5]] mm`, become rows parted by semicolons. Everything else is left as it is.
 */
export function quoteUnitLists(text: string): string {
  return text.replace(LIST_WITH_UNIT, (_whole, list: string, unit: string) => {
    const inner = list
      .slice(1, -1)
      .replace(/\](\s*),/g, ' $1;')
      .replace(/[[\]]/g, ' ');
    return `"${inner}${unit}"`;
  });
}

/** Pieces that every figure shares: escaping, the root element with its texts for screen readers, theme colours. */

/** Text made safe for element content and quoted attributes of HTML and SVG. Control characters become U+FFFD. */
export function escapeText(text: string): string {
  return text
    .replace(/&/g, '&amp;')
    .replace(/</g, '&lt;')
    .replace(/>/g, '&gt;')
    .replace(/"/g, '&quot;')
    .replace(/'/g, '&#39;')
    .replace(CONTROLS, '\ufffd');
}

/** Characters that XML 1.0 does not allow, section 2.2. */
// biome-ignore lint/suspicious/noControlCharactersInRegex: finding control characters is the purpose.
const CONTROLS = /[\u0000-\u0008\u000b\u000c\u000e-\u001f\ufffe\uffff]/g;

/** Coordinate with at most two decimals: a hundredth of a pixel cannot be seen. */
export function px(value: number): string {
  return (Math.round(value * 100) / 100 + 0).toString();
}

/** What a figure says about itself. */
export interface FigureTexts {
  /** Short name: what the reader is looking at. */
  readonly title: string;
  /** One or two sentences with the main figures, for those who cannot see it. */
  readonly description: string;
}

/** Line and bar colour that reads on white and on black, at least 3:1 against both (WCAG 2.2, 1.4.11). */
export const ACCENT = '#2b7fae';

/** Ids inside one page must differ: made from the figure's title. */
export function figureId(title: string, part: string): string {
  let hash = 0x811c9dc5;
  for (let i = 0; i < title.length; i++) hash = Math.imul(hash ^ title.charCodeAt(i), 0x01000193) >>> 0;
  return `f${hash.toString(36)}-${part}`;
}

/**
 * Root element round the body. Colours of lines and text are `currentColor`, so that a page gives them; alone the
 * figure is dark on nothing.
 */
export function svgRoot(width: number, height: number, texts: FigureTexts, body: string): string {
  const title = figureId(texts.title, 'title');
  const description = figureId(texts.title, 'desc');
  return `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 ${px(width)} ${px(height)}" width="${px(width)}" height="${px(height)}" role="img" aria-labelledby="${title} ${description}" color="#1c2733" fill="currentColor" font-family="system-ui, 'Segoe UI', Roboto, 'Helvetica Neue', Arial, sans-serif" font-size="13"><title id="${title}">${escapeText(texts.title)}</title><desc id="${description}">${escapeText(texts.description)}</desc>${body}</svg>`;
}

/** A figure as a file of its own: with a background and both themes. */
export function standaloneSvg(svg: string): string {
  const style =
    '<style>svg{color:#1c2733;background:#fff}@media (prefers-color-scheme:dark){svg{color:#dfe6ec;background:#10171d}}</style>';
  return `<?xml version="1.0" encoding="UTF-8"?>\n${svg.replace('<title', `${style}<title`)}\n`;
}

/** Text element; `extra` are further attributes, already safe. */
export function textAt(x: number, y: number, text: string, extra = ''): string {
  return `<text x="${px(x)}" y="${px(y)}"${extra === '' ? '' : ` ${extra}`}>${escapeText(text)}</text>`;
}

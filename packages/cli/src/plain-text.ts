/**
 * Text for terminals and logs of any encoding: thin spaces, true minus signs, dashes and multiplication signs as
 * their ASCII stand-ins, powers in units back to figures.
 */
export function plainText(text: string): string {
  return text
    .replaceAll('\u2009', ' ')
    .replace(/[\u2212\u2013]/g, '-')
    .replaceAll('\u00b1', '+-')
    .replaceAll('\u00d7', 'x')
    .replaceAll('\u00b2', '2')
    .replaceAll('\u00b3', '3')
    .replaceAll('\u00b5', 'u')
    .replaceAll('\u221e', 'infinite');
}

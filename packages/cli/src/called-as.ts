import { isAbsolute, relative, sep } from 'node:path';

/**
 * How the user can call the command again from where they are: npm sets these variables for what it starts, and then
 * the command is found through npx only, outside the program's own folder with its address.
 */
export function calledAs(env: NodeJS.ProcessEnv = process.env, folder = process.cwd()): string {
  const throughNpm = env['npm_command'] !== undefined || env['npm_lifecycle_event'] !== undefined;
  if (!throughNpm) return 'wakeloom';
  const house = env['npm_config_local_prefix'];
  if (house === undefined || isWithin(folder, house)) return 'npx wakeloom';
  return `npx --prefix ${/\s/.test(house) ? `"${house}"` : house} wakeloom`;
}

function isWithin(folder: string, house: string): boolean {
  const way = relative(house, folder);
  return way !== '..' && !way.startsWith(`..${sep}`) && !isAbsolute(way);
}

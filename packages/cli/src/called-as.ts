/**
 * How the user can call the command again: npm sets these variables for what it starts, and then the command is
 * found through npx only.
 */
export function calledAs(env: NodeJS.ProcessEnv = process.env): string {
  const throughNpm = env['npm_command'] !== undefined || env['npm_lifecycle_event'] !== undefined;
  return throughNpm ? 'npx wakeloom' : 'wakeloom';
}

export async function main(argv: readonly string[]): Promise<number> {
  process.stdout.write(`${argv.join(' ')}\n`);
  return 0;
}

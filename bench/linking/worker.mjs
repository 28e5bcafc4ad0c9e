// One worker process of the linking harness: measures the cases it is sent, one after the other. Errors go back as text.
const [, , address, places] = process.argv;
const { measureCase } = await import(address);

process.on('message', async (one) => {
  try {
    process.send({ result: await measureCase(one, JSON.parse(places)) });
  } catch (error) {
    process.send({ error: error instanceof Error ? error.stack : String(error) });
  }
});
process.send({ ready: true });

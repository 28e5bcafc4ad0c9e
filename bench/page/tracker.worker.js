import '@wakeloom/tracker/worker';

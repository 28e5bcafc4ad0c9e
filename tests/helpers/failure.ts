import { isWakeloomError } from '@wakeloom/tracker/core/errors';

/** The message with which a promise is rejected; an error of its own where it is not, or with another code. */
export async function needFailure(work: Promise<unknown>, code: string): Promise<string> {
  try {
    await work;
  } catch (error) {
    if (isWakeloomError(error) && error.code === code) return error.message;
    throw error;
  }
  throw new Error(`expected ${code}, got no error`);
}

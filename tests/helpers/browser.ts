import { type Browser, chromium } from 'playwright-core';

/** Starts Debian's Chromium without a window. Ask `needs('chromium')` first. */
export function startChromium(): Promise<Browser> {
  return chromium.launch({
    executablePath: '/usr/bin/chromium',
    args: [
      '--no-sandbox',
      '--disable-quic',
      '--no-first-run',
      '--disable-background-networking',
      '--disable-component-update',
      '--disable-sync',
    ],
  });
}

import { type Browser, chromium } from 'playwright-core';

/** Debian's chromium, or the program that LAPWING_CHROMIUM names. */
export function launchBrowser(): Promise<Browser> {
  return chromium.launch({
    executablePath: process.env.LAPWING_CHROMIUM || '/usr/bin/chromium',
    args: [
      '--headless',
      '--no-sandbox',
      '--disable-gpu',
      '--disable-quic',
      '--no-first-run',
      '--disable-background-networking',
      '--disable-component-update',
      '--disable-sync',
    ],
  });
}

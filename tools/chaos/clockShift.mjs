/**
 * Loaded before a daemon (`--import`), it sets that process's clock off by what a file says: seconds,
 * read anew as it changes. The program itself knows nothing of it. A debugger of clocks, as libfaketime
 * is, without a library that has to fit the C library.
 */
import { readFileSync } from 'node:fs';

const file = process.env.CHAOS_CLOCK_FILE;
const RealDate = Date;
let shift_ms = 0;

function look() {
  try {
    shift_ms = Number(readFileSync(file, 'utf8')) * 1000 || 0;
  } catch {
    shift_ms = 0;
  }
}

if (file) {
  look();
  setInterval(look, 50).unref();
  globalThis.Date = class extends RealDate {
    constructor(...parts) {
      if (parts.length === 0) super(RealDate.now() + shift_ms);
      else super(...parts);
    }
    static now() {
      return RealDate.now() + shift_ms;
    }
  };
}

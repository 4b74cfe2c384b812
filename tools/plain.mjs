/**
 * Has node run the sources as the compiler leaves them: `node --import ./tools/plain.mjs tools/x.ts`.
 * tsx wraps each inner function to keep its name, which makes the bed kernel half as slow again.
 */
import { register } from 'node:module';

register('./plainModules.mjs', import.meta.url);
process.setSourceMapsEnabled(true);

/**
 * Holds 40 MB and makes garbage that has grown old; prints the largest heap that was seen [MB].
 * With the argument `bound` as the daemon does.
 */
import { boundHeapGrowth } from '../../src/daemon/heapGrowth.js';

if (process.argv[2] === 'bound') boundHeapGrowth();
const numbers = (from: number, count: number) => Array.from({ length: count }, (_, i) => from + i);
const held = Array.from({ length: 400 }, (_, n) => numbers(n, 12_500));
const passing: number[][] = [];
let most = 0;
for (let n = 0; n < 60_000; n++) {
  passing.push(numbers(n + 0.5, 1000));
  // Long enough to outlive two collections of young objects.
  if (passing.length > 3000) passing.splice(0, 1000);
  if (n % 100 === 0) most = Math.max(most, process.memoryUsage().heapUsed);
}
console.log(JSON.stringify({ most_MB: most / 2 ** 20, held: held.length }));

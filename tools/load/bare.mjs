// A bare MQTT.js subscriber: counts what a kept session brings and says how long it took.
import { readFileSync } from 'node:fs';
import { connect } from 'mqtt';

const [url, topicsFile, wanted, protocol] = process.argv.slice(2);
const topics = JSON.parse(readFileSync(topicsFile, 'utf8'));
let count = 0;
let first_ms = 0;
const properties = { sessionExpiryInterval: 86_400, receiveMaximum: 2048 };
const client = connect(url, {
  clientId: 'bare',
  clean: false,
  // As rockhour's link: no trace of each packet.
  log: () => {},
  resubscribe: false,
  protocolVersion: Number(protocol),
  ...(protocol === '5' ? { properties } : {}),
});
client.on('message', () => {
  if (count === 0) first_ms = performance.now();
  count++;
  if (count !== Number(wanted)) return;
  console.log(JSON.stringify({ count, ms: performance.now() - first_ms }));
  // Acknowledgements on their way still go out.
  client.end(false);
});
client.on('connect', () => {
  client.subscribe(topics, { qos: 1 }, () => {
    if (Number(wanted) === 0) client.end(false);
  });
});

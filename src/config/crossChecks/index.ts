import { channelTopic, expandString } from '../expand.js';
import { type Path, pathText } from '../faults.js';
import type { SiteBlock, UnitBlock } from '../schema/site.js';
import { accessFaults } from './access.js';
import { channelFaults } from './channels.js';
import { connectionFaults } from './connection.js';
import { type CrossFault, cross, repeated } from './cross.js';
import { lateFaults } from './late.js';
import { limitFaults } from './limits.js';
import { machineFaults } from './machine.js';
import { operationFaults } from './operation.js';
import { sparkplugFaults } from './sparkplug.js';
import { storeFaults } from './store.js';

/** Everything that no single key can tell: names used twice, values that contradict each other. */
export function crossFaults(site: SiteBlock): CrossFault[] {
  const unitPath = (u: number): Path => ['units', u];
  return [
    ...repeated(
      site.units.map((unit, u) => ({ name: unit.id, path: [...unitPath(u), 'id'] })),
      'another id than every other unit',
      pathText,
    ),
    ...site.units.flatMap((unit, u) => unitFaults(unit, unitPath(u))),
    ...topicFaults(site),
    ...sparkplugFaults(site),
    ...serviceFaults(site),
    ...lateFaults(site),
    ...accessFaults(site),
  ];
}

function unitFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const storePath = (s: number): Path => [...path, 'stores', s];
  return [
    ...repeated(
      unit.stores.map((store, s) => ({ name: store.id, path: [...storePath(s), 'id'] })),
      'another id than the other store of the unit',
      pathText,
    ),
    ...repeated(
      unit.stores.map((store, s) => ({ name: store.kind, path: [...storePath(s), 'kind'] })),
      'one store of each kind: a unit has at most one hot and one cold store',
      pathText,
    ),
    ...unit.stores.flatMap((store, s) => storeFaults(store, storePath(s))),
    ...channelFaults(unit, path),
    ...machineFaults(unit, path),
    ...limitFaults(unit, path),
    ...operationFaults(unit, path),
    ...connectionFaults(unit, path),
  ];
}

function topicFaults(site: SiteBlock): CrossFault[] {
  const prefix = site.mqtt.in_prefix;
  const entries: { name: string; path: Path }[] = [];
  site.units.forEach((unit, u) => {
    unit.stores.forEach((store, s) => {
      store.strings.forEach((string, k) => {
        const path: Path = ['units', u, 'stores', s, 'strings', k, 'topic'];
        for (const name of new Set(expandString(unit.id, store, string, prefix).topics)) {
          entries.push({ name, path });
        }
      });
    });
    unit.channels.forEach((channel, c) => {
      if (channel.payload === 'sparkplug') return;
      entries.push({
        name: channelTopic(unit, channel, prefix),
        path: ['units', u, 'channels', c, 'topic'],
      });
    });
  });
  const own = `${site.mqtt.out_prefix}/`;
  return [
    ...repeated(entries, 'a topic that nothing else uses', pathText),
    ...entries
      .filter((e) => e.name.startsWith(own))
      .map((e) =>
        cross(e.path, e.name, `a topic outside mqtt.out_prefix (${site.mqtt.out_prefix})`, {
          others: [
            ['mqtt', 'out_prefix'],
            ['mqtt', 'in_prefix'],
          ],
          hint: 'rockhour would read what it has published itself',
        }),
      ),
  ];
}

function serviceFaults(site: SiteBlock): CrossFault[] {
  const faults: CrossFault[] = [];
  for (const name of ['mqtt', 'influx'] as const) {
    const block = site[name];
    if (block?.password_env !== undefined && block.password_file !== undefined) {
      faults.push({
        ...cross([name, 'password_env'], undefined, 'one of password_env and password_file', {
          others: [[name, 'password_file']],
        }),
        found: 'both',
      });
    }
  }
  site.notify.webhooks.forEach((webhook, i) => {
    const path = ['notify', 'webhooks', i] as const;
    if (webhook.secret_env !== undefined && webhook.secret_file !== undefined) {
      faults.push({
        ...cross([...path, 'secret_env'], undefined, 'one of secret_env and secret_file', {
          others: [[...path, 'secret_file']],
        }),
        found: 'both',
      });
    }
    const first = site.notify.webhooks.findIndex(({ id }) => id === webhook.id);
    if (first < i) {
      faults.push(
        cross([...path, 'id'], webhook.id, 'a name that no other receiver has', {
          others: [['notify', 'webhooks', first, 'id']],
        }),
      );
    }
  });
  const { mqtt, http, store } = site;
  if (mqtt.url === undefined && http.port !== 0 && http.port === mqtt.embedded_port) {
    faults.push(
      cross(['http', 'port'], http.port, 'another port than mqtt.embedded_port', {
        others: [
          ['mqtt', 'embedded_port'],
          ['mqtt', 'url'],
        ],
      }),
    );
  }
  if (store.thin_after_days > store.keep_estimates_days) {
    faults.push(
      cross(
        ['store', 'thin_after_days'],
        store.thin_after_days,
        `at most keep_estimates_days (${store.keep_estimates_days})`,
        { others: [['store', 'keep_estimates_days']] },
      ),
    );
  }
  return faults;
}

import { connectAsync, type IClientOptions, type MqttClient } from 'mqtt';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { ROLES } from '../../../src/access/role.js';
import { EmbeddedBroker } from '../../../src/adapters/mqtt/broker.js';
import {
  matches,
  mayPublish,
  maySubscribe,
  TopicSet,
} from '../../../src/adapters/mqtt/topicRules.js';
import { holders } from '../../access/holders.js';

const READING = 'plant/unit1/hot/A';
const COMMAND = 'rockhour/unit1/alarms/command';
const topics = {
  out_prefix: 'rockhour',
  readings: new TopicSet([READING, 'spBv1.0/plant/+/gate/#']),
  commands: [COMMAND],
};

describe('every topic and every role', () => {
  const who = (may: (role: (typeof ROLES)[number]) => boolean) => ROLES.filter(may).join(' ');

  it.each([
    [READING, 'feed'],
    ['spBv1.0/plant/DDATA/gate/flow', 'feed'],
    ['spBv1.0/plant/DDATA/other/flow', ''],
    ['plant/unit1/hot/B', ''],
    [`${READING}/more`, ''],
    [COMMAND, 'acknowledge configure'],
    ['rockhour/unit2/alarms/command', ''],
    ['rockhour/unit1/alarms', ''],
    ['rockhour/unit1/estimate', ''],
    ['rockhour/heartbeat', ''],
    ['$SYS/anything', ''],
  ])('is published to: %s by %s', (topic, roles) => {
    expect(who((role) => mayPublish(role, topic, topics))).toBe(roles);
  });

  it.each([
    ['rockhour/#', 'view acknowledge configure'],
    ['rockhour/+/estimate', 'view acknowledge configure'],
    ['rockhour/heartbeat', 'view acknowledge configure'],
    ['rockhour', ''],
    ['#', ''],
    ['+/unit1/#', ''],
    ['rockhours/#', ''],
    ['plant/#', ''],
    [READING, ''],
    ['$SYS/#', ''],
    ['$refused', ''],
    ['spBv1.0/plant/NCMD/gate', 'feed'],
    ['spBv1.0/plant/DCMD/gate/flow', 'feed'],
    ['spBv1.0/STATE/host', 'feed'],
    ['spBv1.0/plant/DDATA/gate/flow', ''],
    ['spBv1.0/#', ''],
    ['spBv1.0/+/NCMD/#', ''],
  ])('is subscribed to: %s by %s', (filter, roles) => {
    expect(who((role) => maySubscribe(role, filter, topics))).toBe(roles);
  });

  it.each([
    ['a/+/c', 'a/b/c', true],
    ['a/#', 'a', true],
    ['a/#', 'a/b/c', true],
    ['a/+', 'a/b/c', false],
    ['a/b', 'a/b/c', false],
    ['a/b/c', 'a/b', false],
    ['#', '$SYS/x', false],
    ['+/x', '$SYS/x', false],
  ])('filter %s, topic %s: %s', (filter, topic, fits) => {
    expect(matches(filter, topic)).toBe(fits);
  });
});

describe('its own broker, with tokens', () => {
  const { access, tokens, list } = holders();
  let broker: EmbeddedBroker;
  let refused: string[] = [];
  let link: MqttClient;
  let came: string[] = [];
  const opened: MqttClient[] = [];

  async function open(options: IClientOptions): Promise<MqttClient> {
    const client = await connectAsync(broker.url, { reconnectPeriod: 0, ...options });
    opened.push(client);
    return client;
  }
  const as = (role: (typeof ROLES)[number], options: IClientOptions = {}) =>
    open({ username: `a_${role}`, password: tokens[role], ...options });

  beforeEach(async () => {
    access.replace(list);
    [refused, came] = [[], []];
    broker = new EmbeddedBroker('127.0.0.1', 0, {
      ...{ access, own_ids: ['rockhour', 'rockhour-sparkplug'], ...topics },
      refused: (what, text) => refused.push(`${what}: ${text}`),
    });
    await broker.start();
    link = await open({ clientId: 'rockhour', ...broker.login! });
    link.on('message', (topic, payload) => came.push(`${topic} ${payload}`));
    await link.subscribeAsync('#', { qos: 1 });
  });
  afterEach(async () => {
    await Promise.all(opened.splice(0).map((client) => client.endAsync(true)));
    await broker.stop();
  });

  it('lets in by name and token alone, and nobody under the id of its own link', async () => {
    const wrong: IClientOptions[] = [
      {},
      { username: 'a_feed' },
      { username: 'a_feed', password: 'wrong' },
      { username: 'a_view', password: tokens.feed },
      { username: 'rockhour', password: 'rockhour' },
      { clientId: 'rockhour', username: 'a_configure', password: tokens.configure },
      { clientId: 'rockhour-sparkplug', username: 'a_feed', password: tokens.feed },
    ];
    for (const options of wrong) await expect(open(options)).rejects.toThrow(/authorized|refused/i);
    expect(refused).toHaveLength(wrong.length);
    for (const token of Object.values(tokens)) expect(refused.join()).not.toContain(token);
    expect(link.connected).toBe(true);
  });

  it('takes readings of a feed, throws away what else it says, and the client stays', async () => {
    const gateway = await as('feed');
    await gateway.publishAsync('rockhour/unit1/estimate', 'false', { qos: 1, retain: true });
    await gateway.publishAsync(COMMAND, '{}', { qos: 1 });
    await gateway.publishAsync(READING, '1', { qos: 1 });
    await expect.poll(() => came.length).toBe(1);
    expect(came).toEqual([`${READING} 1`]);
    expect(refused).toEqual([
      'publishes: a_feed to rockhour/unit1/estimate',
      `publishes: a_feed to ${COMMAND}`,
    ]);
    const late = await as('view');
    const kept: string[] = [];
    late.on('message', (topic) => kept.push(topic));
    await late.subscribeAsync('rockhour/#', { qos: 1 });
    await link.publishAsync('rockhour/unit1/alarms', '[]', { qos: 1 });
    await expect.poll(() => kept).toEqual(['rockhour/unit1/alarms']);
  });

  it('signs commands with the name of the token, and keeps service to who may configure', async () => {
    const send = async (role: 'view' | 'acknowledge' | 'configure', command: object) => {
      const client = await as(role);
      await client.publishAsync(COMMAND, JSON.stringify(command), { qos: 1 });
    };
    await send('view', { id: '1', action: 'acknowledge', who: 'x' });
    await send('acknowledge', { id: '2', action: 'acknowledge', who: 'a_configure' });
    await send('acknowledge', { id: '3', action: 'out_of_service', who: 'Ada', why: 'x' });
    await send('configure', { id: '4', action: 'out_of_service', why: 'x' });
    await expect.poll(() => came.length).toBe(2);
    expect(came.map((text) => JSON.parse(text.slice(COMMAND.length + 1)))).toEqual([
      { id: '2', action: 'acknowledge', who: 'a_acknowledge (a_configure)' },
      { id: '4', action: 'out_of_service', why: 'x', who: 'a_configure' },
    ]);
    expect(refused).toHaveLength(2);
  });

  it('without tokens lets all in, but under no id of its own links, nor to what is the broker’s', async () => {
    access.replace([]);
    await expect(open({ clientId: 'rockhour' })).rejects.toThrow(/authorized/i);
    const guest = await open({ clientId: 'guest' });
    // How one broker tells another to end a client of this id.
    await guest.publishAsync('$SYS/another/new/clients', 'rockhour', { qos: 1 });
    await guest.publishAsync('anything', 'x', { qos: 1 });
    await expect.poll(() => came).toEqual(['anything x']);
    expect(link.connected).toBe(true);
    expect(refused).toEqual([
      'logins: rockhour as nobody: the client id is taken',
      'publishes: guest to $SYS/another/new/clients',
    ]);
  });

  it('shows what rockhour says to who may view, and readings to nobody', async () => {
    const viewer = await as('view');
    const seen: string[] = [];
    viewer.on('message', (topic) => seen.push(topic));
    const granted = await Promise.all(
      ['rockhour/#', '#', 'plant/#'].map(async (filter) => {
        const [grant] = await viewer.subscribeAsync(filter, { qos: 1 }).catch(() => []);
        return grant?.qos;
      }),
    );
    expect(granted[0]).toBe(1);
    expect(granted.slice(1).every((qos) => qos !== 1 && qos !== 0)).toBe(true);
    await link.publishAsync(READING, '1', { qos: 1 });
    await link.publishAsync('rockhour/heartbeat', 'x', { qos: 1 });
    await expect.poll(() => seen).toEqual(['rockhour/heartbeat']);
  });

  it('does not publish the will of a client that may not', async () => {
    const viewer = await as('view', {
      will: { topic: 'rockhour/heartbeat', payload: Buffer.from('offline'), qos: 1, retain: true },
    });
    viewer.stream.destroy();
    await expect.poll(() => refused).toEqual(['publishes: a_view to rockhour/heartbeat']);
    await link.publishAsync('end', 'x', { qos: 1 });
    await expect.poll(() => came).toEqual(['end x']);
  });

  it('ends the connection of a token that is taken back', async () => {
    const [gateway, viewer] = [await as('feed'), await as('view')];
    access.replace(list.filter(({ role }) => role !== 'feed'));
    await expect.poll(() => gateway.connected).toBe(false);
    expect(viewer.connected).toBe(true);
    await expect(as('feed')).rejects.toThrow(/authorized/i);
  });
});

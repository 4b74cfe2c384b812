import { randomBytes, timingSafeEqual } from 'node:crypto';
import type { AedesOptions, AedesPublishPacket, Client, PublishPacket } from 'aedes';
import type { Access, Holder } from '../../access/access.js';
import { covers } from '../../access/role.js';
import { recordedWho } from '../../access/who.js';
import { mayPublish, maySubscribe, type Topics } from './topicRules.js';

export interface DoorOptions extends Topics {
  readonly access: Access;
  /** Client ids of rockhour's own links: nobody else comes in under one. */
  readonly own_ids: readonly string[];
  /** Somebody was turned away, or something that a client may not do was left undone. */
  refused(what: 'logins' | 'publishes' | 'subscriptions', text: string): void;
}

/** Where a message goes that its sender may not publish: nobody may subscribe to it. */
const NOWHERE = '$refused';
/** Taking out of service and back, over MQTT as over HTTP. */
const CHANGES = new Set(['out_of_service', 'return_to_service']);
const SHOWN = 120;

type Mine = 'rockhour';

/**
 * Who comes in at the own broker where tokens are set: the name of the token is the user name, the
 * token the password. A message that its sender may not publish is acknowledged and thrown away:
 * MQTT 3.1.1 (3.3.5) leaves the choice between that and ending the connection, and a client whose
 * connection is ended sends it again for ever.
 */
export class Door {
  /** The log-in of rockhour's own links, drawn at each start. */
  readonly login = { username: 'rockhour', password: randomBytes(32).toString('base64url') };
  private readonly inside = new Map<Client, Holder | Mine>();
  private stopListening: (() => void) | null = null;

  constructor(private readonly options: DoorOptions) {}

  start(): void {
    this.stopListening ??= this.options.access.onChange(() => this.turnOut());
  }

  stop(): void {
    this.stopListening?.();
    this.stopListening = null;
    this.inside.clear();
  }

  left(client: Client): void {
    this.inside.delete(client);
  }

  readonly rules: Pick<
    AedesOptions,
    'authenticate' | 'authorizePublish' | 'authorizeSubscribe' | 'authorizeForward'
  > = {
    authenticate: (client, username, password, done) => {
      const shown = password?.toString() ?? '';
      const who = this.whoIs(username ?? '', shown);
      const isTaken = who !== 'rockhour' && this.options.own_ids.includes(client.id);
      if (!isTaken && (who !== null || this.options.access.isOpen)) {
        if (who !== null) this.inside.set(client, who);
        done(null, true);
        return;
      }
      const why = isTaken ? 'the client id is taken' : 'name and token do not belong together';
      this.options.refused(
        'logins',
        `${short(client.id)} as ${short(username ?? 'nobody')}: ${why}`,
      );
      done(null, false);
    },
    authorizePublish: (client, packet, done) => {
      if (client !== null && !this.lets(client, packet)) {
        const { topic } = packet;
        this.options.refused('publishes', `${this.nameOf(client)} to ${short(topic)}`);
        Object.assign(packet, { topic: NOWHERE, payload: Buffer.alloc(0), retain: false });
      }
      done(null);
    },
    authorizeSubscribe: (client, subscription, done) => {
      const who = this.inside.get(client);
      const { topic } = subscription;
      if (
        this.isFree(who) ||
        (isHolder(who) && this.holds(who) && maySubscribe(who.role, topic, this.options))
      ) {
        done(null, subscription);
        return;
      }
      this.options.refused('subscriptions', `${this.nameOf(client)} of ${short(topic)}`);
      done(null, null);
    },
    // Once more at each message: a session of before may have had another role.
    authorizeForward: (client, packet: AedesPublishPacket) => {
      const who = this.inside.get(client);
      if (this.isFree(who)) return packet;
      const may =
        isHolder(who) && this.holds(who) && maySubscribe(who.role, packet.topic, this.options);
      return may ? packet : null;
    },
  };

  /** Whoever shows the log-in of the link, or a token under its own name. */
  private whoIs(username: string, password: string): Holder | Mine | null {
    const { login } = this;
    const [own, shown] = [Buffer.from(login.password), Buffer.from(password)];
    if (own.length === shown.length && timingSafeEqual(own, shown)) return 'rockhour';
    const holder = this.options.access.holderOf(password);
    return holder !== null && holder.name === username ? holder : null;
  }

  /** The link itself, and everybody as long as there are no tokens. */
  private isFree(who: Holder | Mine | undefined): boolean {
    return who === 'rockhour' || this.options.access.isOpen;
  }

  private holds(holder: Holder): boolean {
    return this.options.access.stillHolds(holder);
  }

  private lets(client: Client, packet: PublishPacket): boolean {
    const who = this.inside.get(client);
    // The broker speaks to itself there: of clients to be ended, for one.
    if (packet.topic.startsWith('$')) return false;
    if (this.isFree(who)) return true;
    if (!isHolder(who) || !this.holds(who)) return false;
    if (!mayPublish(who.role, packet.topic, this.options)) return false;
    return who.role === 'feed' || signs(who, packet);
  }

  /** Clients whose token was taken back, and those that came in before there were any. */
  private turnOut(): void {
    if (this.options.access.isOpen) return;
    for (const [client, who] of this.inside) {
      if (isHolder(who) && !this.holds(who)) client.close();
    }
  }

  /** Whose connection it is: by its token, else by the id that it gives itself; '' before that. */
  nameOf(client: Client): string {
    const who = this.inside.get(client);
    return isHolder(who) ? who.name : short(client.id ?? '');
  }
}

const isHolder = (who: Holder | Mine | undefined): who is Holder => typeof who === 'object';

/** Texts of a client, short enough for a log. */
const short = (text: string) => (text.length > SHOWN ? `${text.slice(0, SHOWN)}...` : text);

/**
 * Puts the token's name to a command, as over HTTP. What is no command goes on as it is: it is
 * refused, with an answer, where commands are read.
 * @returns false where the role does not reach
 */
function signs(holder: Holder, packet: PublishPacket): boolean {
  let command: unknown;
  try {
    command = JSON.parse(packet.payload.toString());
  } catch {
    return true;
  }
  if (typeof command !== 'object' || command === null || Array.isArray(command)) return true;
  const { action, who, ...rest } = command as Record<string, unknown>;
  if (CHANGES.has(String(action)) && !covers(holder.role, 'configure')) return false;
  const signed = { ...rest, action, who: recordedWho(holder, who) };
  packet.payload = Buffer.from(JSON.stringify(signed));
  return true;
}

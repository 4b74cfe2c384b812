import { describe, expect, it } from 'vitest';
import { Access } from '../../src/access/access.js';
import { LoginFailures } from '../../src/access/failures.js';
import { covers, ROLES } from '../../src/access/role.js';
import {
  HASH_PATTERN,
  hashOf,
  makeToken,
  repeatedToken,
  TOKEN_PATTERN,
} from '../../src/access/token.js';
import { readTokens } from '../../src/access/tokensFile.js';
import { recordedWho } from '../../src/access/who.js';

describe('roles', () => {
  it('contain each other in their order; feed stands apart', () => {
    const table = ROLES.map((has) => ROLES.map((needed) => (covers(has, needed) ? 1 : 0)).join(''));
    // Rows: who has it; columns: view, acknowledge, configure, feed.
    expect(table).toEqual(['1000', '1100', '1110', '0001']);
  });
});

describe('a token', () => {
  it('is 256 random bits behind a mark, and its hash is the SHA-256 of its text', () => {
    const token = makeToken((bytes) => Buffer.alloc(bytes, 7));
    expect(token).toBe(`rockhour-${Buffer.alloc(32, 7).toString('base64url')}`);
    expect(token).toMatch(new RegExp(`^${TOKEN_PATTERN.source}$`));
    expect(makeToken()).not.toBe(makeToken());
    expect(hashOf(token)).toMatch(HASH_PATTERN);
    // FIPS 180-2, appendix B.1.
    expect(hashOf('abc')).toBe(
      'sha256:ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad',
    );
  });

  it('is known again, and nothing else is', () => {
    const [ada, bob] = [makeToken(), makeToken()];
    const access = new Access([
      { name: 'ada', role: 'view', hash: hashOf(ada) },
      { name: 'bob', role: 'configure', hash: hashOf(bob) },
    ]);
    expect(access.isOpen).toBe(false);
    expect(access.holderOf(ada)).toMatchObject({ name: 'ada', role: 'view' });
    expect(access.holderOf(bob)).toMatchObject({ name: 'bob', role: 'configure' });
    for (const wrong of [
      '',
      ada.slice(0, -1),
      `${ada} `,
      hashOf(ada),
      'x'.repeat(1e6),
      makeToken(),
    ]) {
      expect(access.holderOf(wrong)).toBeNull();
    }
    expect(new Access().isOpen).toBe(true);
  });

  it('that is taken away, or has another role, is known as such at once', () => {
    const [ada, bob] = [makeToken(), makeToken()];
    const tokens = [
      { name: 'ada', role: 'view', hash: hashOf(ada) },
      { name: 'bob', role: 'view', hash: hashOf(bob) },
    ] as const;
    const access = new Access(tokens);
    const holders = [access.holderOf(ada)!, access.holderOf(bob)!];
    let told = 0;
    const end = access.onChange(() => {
      told++;
    });
    access.replace([tokens[0]]);
    expect(holders.map((one) => access.stillHolds(one))).toEqual([true, false]);
    expect(access.holderOf(bob)).toBeNull();
    access.replace([{ ...tokens[0], role: 'acknowledge' }]);
    expect(access.stillHolds(holders[0]!)).toBe(false);
    end();
    access.replace(tokens);
    expect(told).toBe(2);
  });

  it('twice by name or hash is found', () => {
    const one = { name: 'a', role: 'view', hash: hashOf('1') } as const;
    expect(repeatedToken([one, { ...one, name: 'b', hash: hashOf('2') }])).toBeNull();
    expect(repeatedToken([one, { ...one, hash: hashOf('2') }])).toEqual({ index: 1, what: 'name' });
    expect(repeatedToken([one, { ...one, name: 'b' }])).toEqual({ index: 1, what: 'hash' });
  });
});

describe('a tokens file', () => {
  it('has a token a line, with comments and blanks between', () => {
    const text = `# control room\r\nada  view\t${hashOf('1')} # of May\r\n\r\n  gate feed ${hashOf('2')}\n`;
    expect(readTokens(text)).toEqual([
      { name: 'ada', role: 'view', hash: hashOf('1') },
      { name: 'gate', role: 'feed', hash: hashOf('2') },
    ]);
  });

  const secret = makeToken();
  it.each([
    ['', 'no token'],
    [`# ada view ${hashOf('1')}`, 'no token'],
    [`\n${secret}`, 'no name of a token at its beginning in line 2'],
    [`ada owner ${hashOf('1')}`, 'no known role in second place in line 1'],
    [`ada view ${secret}`, 'no hash in third place in line 1'],
    [`ada view ${hashOf('1')} ${secret}`, 'more than three words in line 1'],
    [
      `ada view ${hashOf('1')}\n\nada view ${hashOf('2')}`,
      'a name that stands twice, again in line 3',
    ],
    ['x'.repeat(100_001), 'more than 100000 characters'],
  ])('%# that is none says where, and shows nothing of it', (text, fault) => {
    const found = readTokens(text);
    expect(found).toEqual({ fault });
    expect(JSON.stringify(found)).not.toContain(secret);
  });
});

describe('who is recorded', () => {
  const holder = { name: 'control_room', role: 'acknowledge' } as const;
  it.each([
    [undefined, 'control_room'],
    ['', 'control_room'],
    ['control_room', 'control_room'],
    [' Ada ', 'control_room (Ada)'],
    // Another token's name: the own one stands first, and cannot be left out.
    ['chief', 'control_room (chief)'],
    [7, 7],
  ])('for the holder of a token who says %j', (given, recorded) => {
    expect(recordedWho(holder, given)).toBe(recorded);
  });
});

describe('log-ins that failed', () => {
  it('are told to wait beyond the limit of a minute, each address by itself', () => {
    let now = 0;
    const failures = new LoginFailures(3, () => now);
    expect([1, 2, 3].map(() => failures.add('a'))).toEqual([0, 0, 0]);
    now = 20_000;
    expect(failures.add('a')).toBe(40);
    expect(failures.add('b')).toBe(0);
    now = 60_000;
    expect(failures.add('a')).toBe(0);
    expect(failures.total).toBe(6);
  });

  it('of a million addresses take no more memory than of a thousand', () => {
    const failures = new LoginFailures(3, () => 0);
    for (let i = 0; i < 20_000; i++) failures.add(`address ${i}`);
    expect(failures.addresses).toBe(1000);
  });
});

/**
 * Clients in a process of their own, so that their work is not counted as the daemon's.
 * stdin: JSON {questions: [{kind, url, body?}], clients, seconds}; each client asks one question
 * after another, beginning at its own place in the list. stdout: JSON, a line of what came back.
 */
let text = '';
for await (const chunk of process.stdin) text += chunk;
const { questions, clients, seconds } = JSON.parse(text);
const until_ms = performance.now() + seconds * 1000;

/** @returns what came back, with the code of a refusal; null: an answer */
async function ask({ kind, url, body }) {
  const from_ms = performance.now();
  const post = { method: 'POST', headers: { 'content-type': 'application/json' } };
  const response = await fetch(url, body ? { ...post, body: JSON.stringify(body) } : {});
  const found = await response.json();
  const took_ms = performance.now() - from_ms;
  return { kind, status: response.status, refusal: found.error ?? null, took_ms };
}

async function client(n) {
  const found = [];
  for (let i = n; found.length === 0 || performance.now() < until_ms; i++) {
    const got = await ask(questions[i % questions.length]);
    found.push(got);
    // Who is refused asks again later, not at once.
    if (got.refusal) await new Promise((resolve) => setTimeout(resolve, 250));
  }
  return found;
}

const answers = await Promise.all(Array.from({ length: clients }, (_, n) => client(n)));
process.stdout.write(JSON.stringify(answers));

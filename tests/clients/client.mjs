// A client of the stream, written from sim/stream/README.md alone, for Node. Use, output and exit status are client.py's:
//     node client.mjs ENDPOINT [SECONDS]
import {createHash} from "node:crypto";
import {decode} from "@msgpack/msgpack";
import {Subscriber} from "zeromq";

const knownVersion = 1;
const seen = {first_word: null, unnamed: 0, status: null};
let run = null, expected = null, digests = [];

// NaN in one form. The bytes are copied first: they lie anywhere in the message, a Float64Array needs a multiple of 8.
function oneNan(column) {
  const values = new Float64Array(new Uint8Array(column).buffer);
  const words = new BigUint64Array(values.buffer);
  values.forEach((value, k) => { if (Number.isNaN(value)) words[k] = 0x7ff8000000000000n; });
  return new Uint8Array(values.buffer);
}

function missed(sequence, tick) {
  seen.gaps += sequence - expected[0];
  seen.lost_rows += tick - expected[1];
}

const read = {
  describe(m) {
    if (m.version > knownVersion) {
      console.error(`client: the stream speaks version ${m.version}, known here is ${knownVersion}: take a later client`);
      process.exit(2);
    }
    if (m.run === run) return;  // else the first one, or a new run: begin afresh
    [run, expected] = [m.run, null];
    digests = m.columns.map(() => createHash("sha256"));
    Object.assign(seen, {version: m.version, columns: m.columns.map(c => c.name), rows: 0, blocks: 0, gaps: 0, lost_rows: 0});
  },
  samples(m) {
    if (!expected) {
      expected = [m.sequence, m.first_tick];
      Object.assign(seen, {first_sequence: m.sequence, first_tick: m.first_tick});
    }
    if (m.columns.length !== digests.length || m.columns.some(c => c.length !== 8 * m.rows)) {
      throw new Error(`block ${m.sequence}: ${m.columns.length} columns, not all of them of ${m.rows} rows`);
    }
    m.columns.forEach((column, k) => digests[k].update(oneNan(column)));
    missed(m.sequence, m.first_tick);
    expected = [m.sequence + 1, m.first_tick + m.rows];
    seen.rows += m.rows;
    seen.blocks += 1;
  },
  end(m) {
    if (expected) missed(m.blocks, m.rows);
    Object.assign(seen, {status: m.status, end: m});
  },
};

async function listen(endpoint, seconds) {
  const socket = new Subscriber({linger: 0});
  socket.subscribe();
  socket.connect(endpoint);
  try {
    while (seen.status === null) {
      const [topic, body] = await socket.receive();
      const word = topic.toString("ascii").split("/")[0];
      seen.first_word ??= word;
      const m = decode(body);
      if (word === "describe") {
        read.describe(m);
        socket.receiveTimeout = 1000 * seconds;
      } else if (word in read && m.run === run) read[word](m);
      else if (word in read) seen.unnamed += 1;  // not described yet
    }
  } catch (error) {
    if (error.code !== "EAGAIN") throw error;
    console.error(`client: nothing from ${endpoint} for ${seconds} s`);
  }
  seen.sha256 = createHash("sha256").update(Buffer.concat(digests.map(digest => digest.digest()))).digest("hex");
  console.log(JSON.stringify(seen));
  process.exit(seen.status ? 0 : 1);
}

if (![3, 4].includes(process.argv.length)) {
  console.error("usage: node client.mjs ENDPOINT [SECONDS]");
  process.exit(2);
}
await listen(process.argv[2], Number(process.argv[3] ?? 5));

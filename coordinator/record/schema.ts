// The format of record.db. It is an SQLite database in WAL mode; application_id says that it is ours and
// user_version which format it has. A newer format is refused, an older one would be converted here.
//
//   meta           what the search is: plan, text of the search file, pinned plug-in, with digests
//   holder         which coordinator may write (one row); the fence of every append
//   appends        one row a transaction: chain head, and the keys of all rows the transaction added
//   workers        who simulated, as a small number; processor is the class of its processor, '' where unknown
//   results        one row an evaluation, as it arrived
//   overruled      results that another took the place of (in append `replaced_in`), oldest first
//   commits        one row an island and transaction: commits first .. first + count - 1; `evaluations` is null
//                  where commit n took evaluation n, else differences (bytes.ts); digest of the last one
//   confirmations, births, mail, events     one row each
//   snapshots      states of islands, a cache with a checksum of its own, outside the chain
//
// The chain: head(0) = SHA-256 of meta, head(n) = SHA-256(head(n - 1), columns of append n without its head,
// columns of every row it names, in the order named). Rows of the chained tables are never changed or
// deleted, only a result may move to `overruled` as it is.

/** 'SKRY': tells our databases from others. */
export const applicationId = 0x534b5259
export const formatVersion = 1
/** Older ones can damage a database in WAL mode when two connections checkpoint at once (mended in 3.51.3). */
export const oldestSafeSqlite: readonly [number, number, number] = [3, 51, 3]

export interface TableShape {
  /** In order; the first `keys` of them are the primary key. */
  readonly columns: readonly string[]
  readonly keys: number
}

/** Tables under the chain, in the order in which an append names their rows. */
export const chained = {
  workers: { columns: ['number', 'worker', 'host', 'processor'], keys: 1 },
  results: {
    columns: ['island', 'evaluation', 'worker', 'attempt', 'cpu_seconds', 'failures', 'numbers'],
    keys: 2,
  },
  confirmations: {
    columns: ['island', 'evaluation', 'number', 'worker', 'by', 'agrees', 'digest'],
    keys: 3,
  },
  births: { columns: ['id', 'parents', 'origin', 'at_commit', 'genome'], keys: 1 },
  commits: { columns: ['island', 'first', 'count', 'evaluations', 'digest'], keys: 2 },
  mail: { columns: ['island', 'epoch', 'at_commit', 'ended', 'emigrants'], keys: 2 },
  events: {
    columns: ['sequence', 'kind', 'island', 'at_commit', 'epoch', 'changes_search', 'sentence', 'data'],
    keys: 1,
  },
} as const satisfies { readonly [table: string]: TableShape }

export type ChainedTable = keyof typeof chained
export const chainedTables = Object.keys(chained) as readonly ChainedTable[]

export function insertSql(table: ChainedTable): string {
  const { columns } = chained[table]
  const places = columns.map(() => '?').join(', ')
  return `INSERT INTO ${table} (${columns.join(', ')}) VALUES (${places}) ON CONFLICT DO NOTHING`
}
export function selectSql(table: ChainedTable): string {
  const { columns, keys } = chained[table]
  const where = columns.slice(0, keys).map((column) => `${column} = ?`)
  return `SELECT ${columns.join(', ')} FROM ${table} WHERE ${where.join(' AND ')}`
}

export const createTables = `
CREATE TABLE meta (key TEXT PRIMARY KEY, value ANY NOT NULL) STRICT, WITHOUT ROWID;
CREATE TABLE holder (
  one INTEGER PRIMARY KEY CHECK (one = 1), epoch INTEGER NOT NULL, nonce TEXT NOT NULL, host TEXT NOT NULL,
  machine TEXT NOT NULL, pid INTEGER NOT NULL, process_start TEXT NOT NULL, since_ms INTEGER NOT NULL,
  beats INTEGER NOT NULL, beat_ms INTEGER NOT NULL
) STRICT;
CREATE TABLE appends (
  sequence INTEGER PRIMARY KEY, epoch INTEGER NOT NULL, at_ms INTEGER NOT NULL, arrivals INTEGER NOT NULL,
  cpu_seconds REAL NOT NULL, contents BLOB NOT NULL, head BLOB NOT NULL
) STRICT;
CREATE TABLE workers (
  number INTEGER PRIMARY KEY, worker TEXT NOT NULL, host TEXT NOT NULL, processor TEXT NOT NULL,
  UNIQUE (worker, host, processor)
) STRICT;
CREATE TABLE results (
  island INTEGER NOT NULL, evaluation INTEGER NOT NULL, worker INTEGER NOT NULL, attempt INTEGER NOT NULL,
  cpu_seconds REAL NOT NULL, failures TEXT, numbers BLOB NOT NULL, PRIMARY KEY (island, evaluation)
) STRICT, WITHOUT ROWID;
CREATE TABLE overruled (
  island INTEGER NOT NULL, evaluation INTEGER NOT NULL, number INTEGER NOT NULL, replaced_in INTEGER NOT NULL,
  worker INTEGER NOT NULL, attempt INTEGER NOT NULL, cpu_seconds REAL NOT NULL, failures TEXT,
  numbers BLOB NOT NULL, PRIMARY KEY (island, evaluation, number)
) STRICT, WITHOUT ROWID;
CREATE TABLE confirmations (
  island INTEGER NOT NULL, evaluation INTEGER NOT NULL, number INTEGER NOT NULL, worker INTEGER NOT NULL,
  by TEXT NOT NULL, agrees INTEGER NOT NULL, digest BLOB NOT NULL, PRIMARY KEY (island, evaluation, number)
) STRICT, WITHOUT ROWID;
CREATE TABLE births (
  id INTEGER PRIMARY KEY, parents BLOB NOT NULL, origin TEXT NOT NULL, at_commit INTEGER NOT NULL,
  genome BLOB NOT NULL
) STRICT;
CREATE TABLE commits (
  island INTEGER NOT NULL, first INTEGER NOT NULL, count INTEGER NOT NULL, evaluations BLOB,
  digest BLOB NOT NULL, PRIMARY KEY (island, first)
) STRICT, WITHOUT ROWID;
CREATE TABLE mail (
  island INTEGER NOT NULL, epoch INTEGER NOT NULL, at_commit INTEGER NOT NULL, ended INTEGER NOT NULL,
  emigrants BLOB NOT NULL, PRIMARY KEY (island, epoch)
) STRICT, WITHOUT ROWID;
CREATE TABLE events (
  sequence INTEGER PRIMARY KEY, kind TEXT NOT NULL, island INTEGER NOT NULL, at_commit INTEGER NOT NULL,
  epoch INTEGER NOT NULL, changes_search INTEGER NOT NULL, sentence TEXT NOT NULL, data TEXT
) STRICT;
CREATE TABLE snapshots (
  island INTEGER NOT NULL, number INTEGER NOT NULL, digest BLOB NOT NULL, checksum BLOB NOT NULL,
  state BLOB NOT NULL, PRIMARY KEY (island, number)
) STRICT;
`

// Where a search's Redis is to be found, as its coordinator writes it into the record's folder: the only thing that
// workers on a site with nothing but a shared file system need to know. The file holds a password: mode 0600.

import { z } from 'zod'

/** Name of the file in the record's folder. */
export const rendezvousFile = 'coordinator.json'

export const rendezvousSchema = z.strictObject({
  protocol: z.number(),
  /** For workers: with name and password. */
  url: z.string().min(1).max(1024),
  /** The coordinator's hold on the record: a larger number is a later coordinator. */
  holder: z.number().int().nonnegative(),
  host: z.string().max(256),
  pid: z.number().int().nonnegative(),
  /** For a person, by that host's clock. */
  writtenAt: z.string().max(64),
  /** What the coordinator signs pinned problems with, hex. */
  clusterKey: z.string().min(32).max(2048).optional(),
})
export type Rendezvous = z.infer<typeof rendezvousSchema>

/** How a person reaches the page of a coordinator that runs on another machine. */
export function tunnelLine(host: string, port: number, loginNode = 'LOGIN-NODE'): string {
  return `ssh -L ${port}:${host}:${port} ${loginNode}`
}

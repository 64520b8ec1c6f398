// What one round of a figure says.

export interface Measure {
  readonly name: string
  readonly unit: string
  readonly goal?: { readonly atLeast: number } | { readonly atMost: number }
  /** One round's value. */
  readonly value: number
  /** Told beside it. */
  readonly remark?: string
}

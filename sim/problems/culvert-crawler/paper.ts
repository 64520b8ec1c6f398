export function describeCrawler(_: unknown): readonly string[] {
  return []
}
export function cautionsOf(_: unknown): [] {
  return []
}

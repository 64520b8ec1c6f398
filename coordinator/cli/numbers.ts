// Numbers and times as people read them, in one way everywhere on the command line.

/** 12480 as 12,480. */
export function grouped(count: number): string {
  return String(Math.round(count)).replace(/\B(?=(\d{3})+$)/g, ',')
}

/** About three significant digits, without exponents between 0.001 and a million. */
export function short(value: number): string {
  if (value === 0) return '0'
  const size = Math.abs(value)
  if (size >= 1e6 || size < 1e-3) return value.toExponential(2)
  if (size >= 1000) return `${value < 0 ? '-' : ''}${grouped(size)}`
  const decimals = size >= 100 ? 0 : size >= 10 ? 1 : size >= 1 ? 2 : size >= 0.1 ? 3 : size >= 0.01 ? 4 : 5
  return value.toFixed(decimals)
}

/** 0.062 as '6.2 %'; 100 % only when it is all. */
export function percent(fraction: number): string {
  if (fraction >= 1) return '100 %'
  const value = Math.min(99.9, Math.max(0, fraction * 100))
  return `${value < 10 ? value.toFixed(1) : Math.floor(value)} %`
}

/** 3 h 12 min, 41 s, 5 d 2 h. */
export function duration(seconds: number): string {
  if (!Number.isFinite(seconds)) return 'an unknown time'
  if (seconds < 1) return `${short(seconds)} s`
  const whole = Math.round(seconds)
  if (whole < 60) return `${whole} s`
  if (whole < 3600) return `${Math.floor(whole / 60)} min ${whole % 60} s`
  if (whole < 86_400) return `${Math.floor(whole / 3600)} h ${Math.floor((whole % 3600) / 60)} min`
  return `${Math.floor(whole / 86_400)} d ${Math.floor((whole % 86_400) / 3600)} h`
}

/** 1 island, 2 islands */
export function counted(count: number, one: string, many = `${one}s`): string {
  return `${grouped(count)} ${count === 1 ? one : many}`
}

/** value ± standard error with its unit, to the digits that the error supports. */
export function estimate(value: number, unit: string, standardError?: number): string {
  const shownUnit = unit === '1' || unit === '' ? '' : ` ${unit}`
  // Less is what rounding leaves of equal numbers.
  if (standardError === undefined || !(standardError > 1e-9 * Math.abs(value)))
    return `${short(value)}${shownUnit}`
  const decimals = Math.min(9, Math.max(0, 1 - Math.floor(Math.log10(standardError))))
  return `${value.toFixed(decimals)} ± ${standardError.toFixed(decimals)}${shownUnit}`
}

// What stands in front of every bundled plug-in, so that its results are the same bits on every machine.
//
// The text made here opens the bundle. It declares `Math`, `Date`, `performance`, `crypto` and `globalThis` in the
// scope of the module, where they hide the host's:
//   Math         the host's exact functions (IEEE 754 rounds them the same way everywhere) and detMath's versions
//                of the others, whose last bit differs between processor families on the host
//   clocks and random numbers throw: everything random about a simulation is drawn from its condition
// A bundler setting lowers `a ** b` to Math.pow, so that it goes the same way.
//
// This protects honest authors from accidents. It is no prison: code that wants the host's functions finds them
// (eval of assembled text, a prototype's constructor); confirmation by a second process catches what that breaks.

/** The host functions that every IEEE 754 machine answers with the same bits. */
export const exactFunctions = [
  'abs', 'ceil', 'clz32', 'floor', 'fround', 'imul', 'max', 'min', 'round', 'sign', 'sqrt', 'trunc',
] as const // biome-ignore format: one glance

/** The host functions whose last bit is the host's own affair. */
export const replacedFunctions = [
  'acos', 'acosh', 'asin', 'asinh', 'atan', 'atan2', 'atanh', 'cbrt', 'cos', 'cosh', 'exp', 'expm1', 'hypot',
  'log', 'log10', 'log1p', 'log2', 'pow', 'sin', 'sinh', 'tan', 'tanh',
] as const // biome-ignore format: one glance

const constants = ['E', 'LN10', 'LN2', 'LOG10E', 'LOG2E', 'PI', 'SQRT1_2', 'SQRT2'] as const

/** Names of the host that the opening text declares anew. */
export const hiddenNames = ['Math', 'Date', 'performance', 'crypto', 'globalThis'] as const
/** Names the opening text needs for itself. */
const ownNames = ['skerryHost', 'skerryDetMath', 'skerryRefuse', 'skerryMathOf', 'skerryDateOf'] as const
/** A plug-in's own top-level names that equal one of these are renamed by the bundler. */
export const reservedNames: readonly string[] = [...hiddenNames, ...ownNames]

/**
 * The opening text. `detMathCode` is a script that declares `skerryDetMathModule`, an object with the exact functions
 * or with a member `detMath` that has them.
 */
export function openingText(detMathCode: string): string {
  const exact = exactFunctions.map((name) => `${name}: host.${name}`)
  const replaced = replacedFunctions.map(
    (name) => `${name}: det.${name} ?? (() => skerryRefuse('Math.${name}', skerryNoFunction))`,
  )
  const fixed = constants.map((name) => `${name}: host.${name}`)
  return `// Opening text: exact mathematics, no clocks, no entropy.
const skerryHost = typeof global === 'object' ? global : self;
const skerryNoFunction = 'it may differ between processors and has no exact version here';
const skerryNoEntropy = 'draw it from the condition';
const skerryNoClock = 'results must not depend on when they are computed; count steps instead';
const skerryRefuse = (name, reason) => {
  throw new Error(name + ' is not available in a plug-in: ' + reason);
};
const skerryDetMath = ((Math) => {
${detMathCode}
return skerryDetMathModule.detMath ?? skerryDetMathModule;
})(skerryHost.Math);
const skerryMathOf = (host, det) => Object.freeze({
  ${[...fixed, ...exact, ...replaced].join(',\n  ')},
  random: () => skerryRefuse('Math.random', skerryNoEntropy),
  [Symbol.toStringTag]: 'Math',
});
const skerryDateOf = (Host) => {
  function Date(...given) {
    if (new.target === undefined || given.length === 0) skerryRefuse('new Date() without a time', skerryNoClock);
    return Reflect.construct(Host, given, new.target);
  }
  Date.prototype = Host.prototype;
  Date.UTC = Host.UTC;
  Date.parse = Host.parse;
  Date.now = () => skerryRefuse('Date.now', skerryNoClock);
  return Date;
};
const Math = skerryMathOf(skerryHost.Math, skerryDetMath);
const Date = skerryDateOf(skerryHost.Date);
const performance = Object.freeze({ now: () => skerryRefuse('performance.now', skerryNoClock) });
const crypto = Object.freeze({
  getRandomValues: () => skerryRefuse('crypto.getRandomValues', skerryNoEntropy),
  randomUUID: () => skerryRefuse('crypto.randomUUID', skerryNoEntropy),
});
const globalThis = Object.create(skerryHost, {
  Math: { value: Math },
  Date: { value: Date },
  performance: { value: performance },
  crypto: { value: crypto },
});
// End of the opening text.
`
}

/** Bundler substitutions for the host's names reached through one of its global objects. */
export function substitutions(): { [expression: string]: string } {
  const table: { [expression: string]: string } = {}
  for (const root of ['window', 'self', 'global', 'globalThis']) {
    for (const name of ['Math', 'Date', 'performance', 'crypto']) table[`${root}.${name}`] = name
  }
  return table
}

// What the golden simulations (golden.ts) give, on every machine. Written by
// SKERRY_WRITE_DIGESTS=1 npx vitest run tests/determinism, after results were changed on purpose: a changed problem
// has a new version, a changed law a line in CHANGELOG.md.

// biome-ignore format: a table
export const golden: { readonly [name: string]: string } = {
  'functions': 'c9ae5bb7f275a9888715155606c1e7607f6e0aaf1459d97905931be707985bb6',
  'signal': 'a9d0b0335341d389013e15302a1b21daea4151d756bc321195435a5c751b2305',
  'modes': '5d7b9547c811dbc4aee4f5168df5576e4c6a3d1012b26237fbaef5ca34a78f8e',
  'lattices, plane, reference': '17308efa50f40b4d0ffa04cad551c87b36659cce5522fcdacff012605a4f7762',
  'lattices, plane, 4 lanes': '17308efa50f40b4d0ffa04cad551c87b36659cce5522fcdacff012605a4f7762',
  'lattices, plane, 1 lane': 'f2a44852c09e3dc0124dd31a5bd5e1b3520d8087403ae08810a58f91e64e4080',
  'lattices, plane, 8 single lanes': '02c63e3c944ff120e2fb2626bb05dc185542923546b052d4de677b30c48bfce4',
  'lattices, space, reference': 'fddf0c1df4a97f30984e82bbfb6cf36dafe999c5a88f148e0cab3354d763d627',
  'lattices, space, 4 lanes': 'fddf0c1df4a97f30984e82bbfb6cf36dafe999c5a88f148e0cab3354d763d627',
  'lattices, space, 2 lanes': '1bd29778fea2743f57c44be69bb832ad0f66e28d5c69ecc8a1c5dafb655b1895',
  'lattices, space, 8 single lanes': 'ea3e31991bdd906fdfcfcca019a1c9fd657f378198462db81fd5f086c168f7da',
  'controllers': '91289771f1d1406ddd4f40c61beb7f50a863162bbd6426a8236e9362d59d67ed',
  'heap rapier3d-deterministic-0.21.0': '2096bf2726e1103bdf3608675bf0f72d79bb7df2af4cb122909deb5a137a4102',
  'culvert-crawler 3': 'bcd4cba02a1fee552b0bbbd9bace1794c554823e3e6a6ac6a2e515fa3906395e',
  'culvert-crawler-3d 2': 'dea8f7e105f3dcfac29f28ffe3efd3f43f60c9f6f8ec4b3eb94315b1b754c0f5',
  'pump-mount 1': '9d6963dc01ce101095be32bbefa6d847c82ab7ed6be05e3bb8699339ca15ae1f',
  'seal-pad 1': 'dbce1f349daca47286576cd710a931a0c76843816076d1d136a0da19909279c5',
  'ramp-walker 1': '7e229e3caf5f9fa83dd07df783b6e06654bbcd7e04387a3c8d3c42c774f36708',
  'screen-rake 1+rapier2d-deterministic-0.20.0': 'a651088f0c95eaffa36a7f4e40d46d3a71a13704e38a10a5796a3074ece059ca',
}

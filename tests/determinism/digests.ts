// What the golden simulations (golden.ts) give, on every machine. Written by
// SKERRY_WRITE_DIGESTS=1 npx vitest run tests/determinism, after results were changed on purpose: a changed problem
// has a new version, a changed law a line in CHANGELOG.md.

// biome-ignore format: a table
export const golden: { readonly [name: string]: string } = {
  'functions': 'c9ae5bb7f275a9888715155606c1e7607f6e0aaf1459d97905931be707985bb6',
  'signal': 'a9d0b0335341d389013e15302a1b21daea4151d756bc321195435a5c751b2305',
  'modes': '5d7b9547c811dbc4aee4f5168df5576e4c6a3d1012b26237fbaef5ca34a78f8e',
  'lattices, plane, reference': '38d1d68dcc16ee8a70912e28c1e0aff8789c98dab50a478e42b36a075550aa67',
  'lattices, plane, 4 lanes': '38d1d68dcc16ee8a70912e28c1e0aff8789c98dab50a478e42b36a075550aa67',
  'lattices, plane, 1 lane': '53c448701f92a377a2517950f4425b4fba195aa090a1fb271d5efabaf64680f1',
  'lattices, plane, 8 single lanes': '66f2f07da8f52337a3864b713aea4f92f91612892059bfa77da09830014e099f',
  'lattices, space, reference': 'b360f08f34de430ad593dbb50875cecd322b531014704b081812b0a349d11c2c',
  'lattices, space, 4 lanes': 'b360f08f34de430ad593dbb50875cecd322b531014704b081812b0a349d11c2c',
  'lattices, space, 2 lanes': '0b21171b52b4c2a932cd92e87b1ae87c1bd867f22bd5848358050cc24f4c31b6',
  'lattices, space, 8 single lanes': '8d75b5d2a10c29bf4f232d5e391e0b64e5c179f1f4a1df0579a881246f9e7ddc',
  'controllers': '91289771f1d1406ddd4f40c61beb7f50a863162bbd6426a8236e9362d59d67ed',
  'heap rapier3d-deterministic-0.21.0': '2096bf2726e1103bdf3608675bf0f72d79bb7df2af4cb122909deb5a137a4102',
  'culvert-crawler 3': '83711f5babd3e7e34e93f05e8931cf7f65a3f78877f6fbc9518c68c9397599f7',
  'culvert-crawler-3d 2': '981f6ad7029e4e4e23a3837b886e16f224c81b9f2b4ef804072629a68155301f',
  'pump-mount 1': '9d6963dc01ce101095be32bbefa6d847c82ab7ed6be05e3bb8699339ca15ae1f',
  'seal-pad 1': 'dbce1f349daca47286576cd710a931a0c76843816076d1d136a0da19909279c5',
  'ramp-walker 1': '7e229e3caf5f9fa83dd07df783b6e06654bbcd7e04387a3c8d3c42c774f36708',
  'screen-rake 1+rapier2d-deterministic-0.20.0': 'a651088f0c95eaffa36a7f4e40d46d3a71a13704e38a10a5796a3074ece059ca',
}

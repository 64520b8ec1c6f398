// What the golden simulations (golden.ts) give, on every machine. Written by
// SKERRY_WRITE_DIGESTS=1 npx vitest run tests/determinism, after results were changed on purpose: a changed problem
// has a new version, a changed law a line in CHANGELOG.md.

// biome-ignore format: a table
export const golden: { readonly [name: string]: string } = {
  'functions': 'c9ae5bb7f275a9888715155606c1e7607f6e0aaf1459d97905931be707985bb6',
  'signal': 'a9d0b0335341d389013e15302a1b21daea4151d756bc321195435a5c751b2305',
  'modes': '5d7b9547c811dbc4aee4f5168df5576e4c6a3d1012b26237fbaef5ca34a78f8e',
  'lattices, plane, reference': '3e09283b3ea41b4cd411d078843232a49db5bc1acaab1d907318e54064b52cb0',
  'lattices, plane, 4 lanes': '3e09283b3ea41b4cd411d078843232a49db5bc1acaab1d907318e54064b52cb0',
  'lattices, plane, 1 lane': '6965027a35b0b5a82da8ff3a3420e862233cf301bad91ca5bebbd6fa51ffc011',
  'lattices, plane, 8 single lanes': 'bc694e104536c119fd615d3aff51b75043e38148adf25281340861612219e239',
  'lattices, space, reference': 'b6e0da8cd2d5a8ca866d08e329ee4ef95c2f575f5b88b9f2cc19429de8962409',
  'lattices, space, 4 lanes': 'b6e0da8cd2d5a8ca866d08e329ee4ef95c2f575f5b88b9f2cc19429de8962409',
  'lattices, space, 2 lanes': 'a3d177581bbdf12b672d65289f994fe0bcffe510ddcefb6e769993532796751a',
  'lattices, space, 8 single lanes': '933a2280d3101639c859a1de86fa0997a07589154d5426afa08dde000aa719cd',
  'controllers': '91289771f1d1406ddd4f40c61beb7f50a863162bbd6426a8236e9362d59d67ed',
  'heap rapier3d-deterministic-0.21.0': '2096bf2726e1103bdf3608675bf0f72d79bb7df2af4cb122909deb5a137a4102',
  'culvert-crawler 3': '83711f5babd3e7e34e93f05e8931cf7f65a3f78877f6fbc9518c68c9397599f7',
  'culvert-crawler-3d 2': '4accfa313f2498b2c9dc3f241561c72c62147ebde5c0ef727919d0665d254752',
  'pump-mount 2': '24d42d827c5d55eea18a91598b9c95b4c5888240e9f63ce879bf26d67a324942',
  'seal-pad 3': '167ccee85d1b7739893881da7b9c4617da73432db4376b23f505eef278301f2b',
  'ramp-walker 1': '7e229e3caf5f9fa83dd07df783b6e06654bbcd7e04387a3c8d3c42c774f36708',
  'screen-rake 3+rapier2d-deterministic-0.20.0': 'e29fe6f13d82ddb59fa703568493530aa13f2dcbebf1e218eaa6cf4c0cc8d9b8',
}

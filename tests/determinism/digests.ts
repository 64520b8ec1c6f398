// What the golden simulations (golden.ts) give, on every machine. Written by
// SKERRY_WRITE_DIGESTS=1 npx vitest run tests/determinism, after results were changed on purpose: a changed problem
// has a new version, a changed law a line in CHANGELOG.md.

// biome-ignore format: a table
export const golden: { readonly [name: string]: string } = {
  'functions': 'c9ae5bb7f275a9888715155606c1e7607f6e0aaf1459d97905931be707985bb6',
  'signal': 'a9d0b0335341d389013e15302a1b21daea4151d756bc321195435a5c751b2305',
  'modes': '5d7b9547c811dbc4aee4f5168df5576e4c6a3d1012b26237fbaef5ca34a78f8e',
  'lattices, plane, reference': '7450a6358b9ae70413108086feab3f5461f4539009fa9ecf91851fe522b419b0',
  'lattices, plane, 4 lanes': '7450a6358b9ae70413108086feab3f5461f4539009fa9ecf91851fe522b419b0',
  'lattices, plane, 1 lane': 'f72bfc58ebe1bb2308b92aafa15a4a9051f4329cf065a5659ff850d0c6038314',
  'lattices, plane, 8 single lanes': 'e69606a45b825da741bece71a191a275cf13f74c95f96fec50546dc3e8f558d4',
  'lattices, space, reference': '9012ddbbee64e2d961d359f4008621ebbd0f8893ce463635d73b274ec5616048',
  'lattices, space, 4 lanes': '9012ddbbee64e2d961d359f4008621ebbd0f8893ce463635d73b274ec5616048',
  'lattices, space, 2 lanes': 'd7b092e917713d9b815d264fa28153a4054941e788f023f02cd1ca0c8600a16f',
  'lattices, space, 8 single lanes': 'c1302f9d20c1bd626cf0ebb4f7d1b2faf2d1ce1170aaaa6735e81ed30fce4d7e',
  'controllers': '91289771f1d1406ddd4f40c61beb7f50a863162bbd6426a8236e9362d59d67ed',
  'heap rapier3d-deterministic-0.21.0': '2096bf2726e1103bdf3608675bf0f72d79bb7df2af4cb122909deb5a137a4102',
  'culvert-crawler 3': '83711f5babd3e7e34e93f05e8931cf7f65a3f78877f6fbc9518c68c9397599f7',
  'culvert-crawler-3d 2': '4accfa313f2498b2c9dc3f241561c72c62147ebde5c0ef727919d0665d254752',
  'pump-mount 2': '24d42d827c5d55eea18a91598b9c95b4c5888240e9f63ce879bf26d67a324942',
  'seal-pad 3': '167ccee85d1b7739893881da7b9c4617da73432db4376b23f505eef278301f2b',
  'ramp-walker 1': '7e229e3caf5f9fa83dd07df783b6e06654bbcd7e04387a3c8d3c42c774f36708',
  'screen-rake 3+rapier2d-deterministic-0.20.0': 'e29fe6f13d82ddb59fa703568493530aa13f2dcbebf1e218eaa6cf4c0cc8d9b8',
}

// What the host and the WebAssembly kernel both know about the kernel's memory: where the head of the memory lies and
// what stands in it. This file is read as TypeScript by the host and as AssemblyScript by the kernel, so it holds
// plain whole numbers only.
//
//   1024  words (32 bits): where every list begins and ends, counts and switches
//   1280  numbers, each as wide as all lanes: constants, step, gravity, terrain, contact law
//   2432  lists (image.ts)
//
// Nothing lies below 1024: the compiler takes that as leave to fold offsets into addresses.

export const wordsAt = 1024
export const numbersAt = 1280
export const listsAt = 2432

// Words. ...First is the address of a list, ...End the address behind it; equal when it is empty.
export const nodesFirst = 1024
export const nodesEnd = 1028
/** Inverse mass, friction, heading of every node. */
export const nodeTable = 1032
export const passiveFirst = 1036
export const passiveEnd = 1040
export const activeFirst = 1044
export const activeEnd = 1048
export const guidedFirst = 1052
export const guidedEnd = 1056
export const dragFirst = 1060
export const dragEnd = 1064
export const fillFirst = 1068
export const fillEnd = 1072
export const apartFirst = 1076
export const apartEnd = 1080
export const sensorFirst = 1084
export const sensorEnd = 1088
export const groupFirst = 1092
export const groupEnd = 1096
export const prescribedFirst = 1100
export const prescribedEnd = 1104
/** One word a lane: address of its heights. */
export const rowsFirst = 1108
/** 1 where there is a ground in some lane. */
export const hasGround = 1112
/** 1 where the exponent of contact is 1.5. */
export const rooted = 1116
/** Steps since the drive began; below 0 before it. */
export const since = 1120
export const rampSteps = 1124
/** The value of `since` at which fresh sines are taken from the groups' records; below 0: not in this call. */
export const freshAt = 1128
/** 1 where some group sweeps in some lane. */
export const sweeping = 1132
/** 1 where there is a limit of depth. */
export const depthLimited = 1136
/** Address of what sample() keeps of struts, of driven struts and of nodes. */
export const strutSamples = 1140
export const drivenSamples = 1144
export const nodeSamples = 1148

// Numbers: places in units of one number in all lanes.
export const oneAt = 0
export const twoAt = 1
export const halfAt = 2
export const perSixAt = 3
export const tinyAt = 4
export const stepAt = 5
export const dragAt = 6
export const gravityAt = 7
/** Highest ground. */
export const topAt = 10
export const firstXAt = 11
export const perSpacingXAt = 12
export const lowColumnAt = 13
export const lastColumnAt = 14
export const firstZAt = 15
export const perSpacingZAt = 16
export const lowRowAt = 17
export const lastRowAt = 18
export const columnsAt = 19
export const contactStiffnessAt = 20
export const contactDampingAt = 21
export const depthLimitAt = 22
export const grownAt = 23
/** Time since the last sample. */
export const sampleSecondsAt = 24
/** A drive group that stands still (sine, cosine), for guided struts without one. */
export const noGroupAt = 25
/** Share of its force limit above which a driven strut is under load. */
export const loadedShareAt = 27
export const numbersCount = 28

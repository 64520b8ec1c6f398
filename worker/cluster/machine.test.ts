import { expect, test } from 'vitest'
import { memoryMB, processorClass, secondsLeft } from './machine.js'

const wallMs = Date.UTC(2026, 11, 1, 12)

test('the class of a processor is vendor, family and model; on arm64 implementer and part', () => {
  const amd =
    'processor\t: 0\nvendor_id\t: AuthenticAMD\ncpu family\t: 25\nmodel\t\t: 1\nmodel name\t: EPYC\n'
  expect(processorClass('x64', amd)).toBe('x64 AuthenticAMD 25/1')
  expect(processorClass('arm64', 'CPU implementer\t: 0x41\nCPU part\t: 0xd0c\n')).toBe('arm64 0x41 0xd0c')
  expect(processorClass('x64', '')).toMatch(/^x64 ./)
})

test('the end comes from --until, else from the batch system, else nobody knows', () => {
  expect(secondsLeft('2026-12-01T13:00:00Z', {}, wallMs)).toBe(3600)
  expect(secondsLeft(String(wallMs / 1000 + 60), { SLURM_JOB_END_TIME: '1' }, wallMs)).toBe(60)
  expect(secondsLeft(undefined, { SLURM_JOB_END_TIME: String(wallMs / 1000 + 90) }, wallMs)).toBe(90)
  expect(secondsLeft(undefined, {}, wallMs)).toBeUndefined()
})

test('an end that is no time, or is over, is refused in words', () => {
  expect(() => secondsLeft('tomorrow', {}, wallMs)).toThrow('--until tomorrow is no time')
  expect(() => secondsLeft('2026-11-30T00:00Z', {}, wallMs)).toThrow('is over')
})

test('memory is the least of what machine and batch system allow', () => {
  expect(memoryMB({ SLURM_MEM_PER_NODE: '300' })).toBe(300)
  expect(memoryMB({ SLURM_MEM_PER_CPU: '100', SLURM_CPUS_ON_NODE: '2' })).toBe(200)
  expect(memoryMB({})).toBeGreaterThan(100)
})

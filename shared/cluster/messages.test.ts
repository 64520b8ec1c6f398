import { expect, test } from 'vitest'
import { heardAnnouncementSchema, protocolVersion } from './messages.js'

test('an announcement of another version is heard as far as who speaks, whatever else it says', () => {
  const heard = heardAnnouncementSchema.parse({
    protocol: 9,
    search: 'weir',
    skerry: '9.1',
    beat: 3,
    novelty: {},
  })
  expect(heard).toMatchObject({ protocol: 9, search: 'weir', skerry: '9.1', beat: 3 })
  expect(heard).not.toHaveProperty('novelty')
})

test('one of our own version that does not fit is not believed', () => {
  expect(
    heardAnnouncementSchema.safeParse({ protocol: protocolVersion, search: 'weir', skerry: '0.1' }).success,
  ).toBe(false)
  expect(heardAnnouncementSchema.safeParse({ search: 'weir' }).success).toBe(false)
})

import { mersenne, xoroshiro128plus } from 'pure-rand'

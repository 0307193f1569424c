"""Input patterns: every state once, or a fixed sequence whose bits are fair and independent of each other."""

from __future__ import annotations

import itertools

import numpy as np

from benchmark.circuits.patterns import EXHAUSTIVE, SAMPLED, patterns


def _states(words):
    """Unpack machine words into one row of bits per input."""
    return np.stack([np.unpackbits(word.view(np.uint8), bitorder="little") for word in words.values()])


def test_few_inputs_take_every_state_equally_often():
    for count in range(1, 12):
        bits = _states(patterns([f"i{k}" for k in range(count)]))
        numbers = (bits.astype(int) << np.arange(count)[:, None]).sum(axis=0)
        seen = np.bincount(numbers, minlength=2**count)
        assert (seen == seen[0]).all()
        assert bits.shape[1] == max(64, 2**count)


def test_many_inputs_take_fair_and_independent_patterns():
    bits = _states(patterns([f"i{k}" for k in range(40)])).astype(np.float64)
    assert bits.shape == (40, SAMPLED)
    limit = 4.5 * 0.5 / np.sqrt(SAMPLED)
    assert (np.abs(bits.mean(axis=1) - 0.5) < limit).all()
    for a, b in itertools.combinations(range(0, 40, 3), 2):
        assert abs(np.corrcoef(bits[a], bits[b])[0, 1]) < 4.5 / np.sqrt(SAMPLED)
    for shift in (1, 2, 7, 64):  # neither are neighbouring patterns of one input alike
        assert abs(np.corrcoef(bits[0, :-shift], bits[0, shift:])[0, 1]) < 4.5 / np.sqrt(SAMPLED)


def test_the_sequence_is_fixed_and_published_values_hold():
    """First outputs of splitmix64 from state 0, as in its reference code (from memory): e220a8397b1dcdaf ..."""
    words = patterns([f"i{k}" for k in range(EXHAUSTIVE + 1)])
    assert int(words["i0"][0]) == 0xE220A8397B1DCDAF
    assert int(words["i0"][1]) == 0x6E789E6AA1B965F4

"""Measured against predicted: level lists, waveform captures, network-analyser files, and the verdict on them."""

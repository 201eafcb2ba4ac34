"""The built-in sounds: a choir voice by source and filter, plain tones and clicks.

==============================  ==================================================
``options.SoundOptions``        vowel, language, singers a part, scatter, vibrato
``stems.stem``                  one part of a tuned score as mono samples
``formants.formants``           resonances of a vowel of a voice type
``spectrum.spectrum``           harmonic amplitudes of a sung tone
==============================  ==================================================
"""

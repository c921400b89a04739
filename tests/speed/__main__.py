"""`python -m tests.speed`: the figures for the propagation core. Only ratios mean anything."""

from tests.speed import accuracy, steps

steps.main()
accuracy.main()

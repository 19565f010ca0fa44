"""What a vortex is: models, their derivations and kernels."""

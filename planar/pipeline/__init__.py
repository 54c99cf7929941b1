"""What planar does, stage by stage: the one package that knows all stages, a module for each job.

Each function takes what the user gave and returns a frozen record of what was done; printing is left
to the command line. Results are written into a temporary folder, read back and compared with the
layout, and only then moved into place. A command imports the module of its job alone.
"""

"""What follows from how a level moves: its rise, the flows, the volumes in and out, how long until brim or suction.

Pure, and in constant time for each reading, however long the windows are.
"""

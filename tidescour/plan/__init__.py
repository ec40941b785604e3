"""What is to be built, and is the plan sound?"""

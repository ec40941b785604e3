"""What did the gauges really read?"""
